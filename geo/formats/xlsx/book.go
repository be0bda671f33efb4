package xlsx

import (
	"archive/zip"
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"path"
	"strconv"
	"strings"

	"groundtally/geo/formats"
)

const (
	doSave    = "save the table as .xlsx or CSV again"
	maxShared = 20_000_000 // texts that cells share
	maxText   = 512 << 20  // bytes of all texts together
)

// sheet is one sheet of cells.
type sheet struct {
	name   string
	part   string
	hidden bool
}

// book is an open workbook.
type book struct {
	ctx   context.Context
	o     Options
	parts map[string]*zip.File // by their names in small letters

	path    string // of the workbook's own part
	sheets  []sheet
	from    epoch
	related map[string]string // other parts that belong to the workbook, by kind
	shared  []string
	styles  []dateForm // by style of cells

	unzipped, reported int64
	text               int64 // bytes of texts kept
}

func (b *book) names() []string {
	out := make([]string, len(b.sheets))
	for i, s := range b.sheets {
		out[i] = s.name
	}
	return out
}

// open finds the sheets of a workbook.
func open(ctx context.Context, r io.ReaderAt, size int64, o Options) (*book, error) {
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	if err := looks(r, size); err != nil {
		return nil, err
	}
	z, err := zip.NewReader(r, size)
	if err != nil && !errors.Is(err, zip.ErrInsecurePath) { // nothing is written under the names of the parts
		if errors.Is(err, zip.ErrFormat) || errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, io.EOF) {
			return nil, &formats.Error{Code: "truncated", What: "the end of the workbook is missing or damaged", Do: "copy it again, or " + doSave, Err: err}
		}
		return nil, &formats.Error{Code: "unreadable", What: "the workbook cannot be read", Do: "copy it again, or " + doSave, Err: err}
	}
	b := &book{ctx: ctx, o: o, parts: map[string]*zip.File{}, related: map[string]string{}}
	for _, f := range z.File {
		name := strings.ToLower(strings.TrimPrefix(strings.ReplaceAll(f.Name, `\`, "/"), "/"))
		if _, twice := b.parts[name]; !twice {
			b.parts[name] = f
		}
	}
	if err := b.workbook(); err != nil {
		return nil, err
	}
	return b, nil
}

// looks refuses what is no workbook by its first bytes.
func looks(r io.ReaderAt, size int64) error {
	if size <= 0 {
		return &formats.Error{Code: "empty_file", What: "the file is empty", Do: doSave}
	}
	head := make([]byte, min(size, 512))
	if n, err := r.ReadAt(head, 0); n < len(head) {
		return &formats.Error{Code: "unreadable", What: "the file cannot be read", Do: "check the disk or the connection to it", Err: err}
	}
	switch {
	case bytes.HasPrefix(head, []byte("\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1")):
		if protected(r, head) {
			return &formats.Error{Code: "password", What: "the workbook is protected by a password", Do: "open it with the password and save it without one, as .xlsx or CSV"}
		}
		return &formats.Error{Code: "old_workbook", What: "the file is a workbook of the old kind, .xls", Do: "save it as .xlsx or CSV"}
	case !bytes.HasPrefix(head, []byte("PK")):
		return &formats.Error{Code: "not_workbook", What: "the file is no workbook", Do: "choose an .xlsx file"}
	}
	return nil
}

// protected tells whether the directory of a compound file names an encrypted package.
func protected(r io.ReaderAt, head []byte) bool {
	if len(head) < 512 {
		return false
	}
	shift := binary.LittleEndian.Uint16(head[30:])
	if shift != 9 && shift != 12 {
		return false
	}
	sector := make([]byte, 1<<shift)
	n, _ := r.ReadAt(sector, (int64(binary.LittleEndian.Uint32(head[48:]))+1)<<shift)
	var name []byte
	for _, c := range []byte("EncryptedPackage") {
		name = append(name, c, 0)
	}
	return bytes.Contains(sector[:n], name)
}

// workbook reads the list of sheets and where their parts are.
func (b *book) workbook() error {
	b.path = "xl/workbook.xml"
	if b.parts["_rels/.rels"] != nil {
		all, err := b.relations("_rels/.rels", "")
		if err != nil {
			return err
		}
		for _, r := range all {
			if r.kind == "officeDocument" {
				b.path = r.part
			}
		}
	}
	if b.parts[strings.ToLower(b.path)] == nil {
		switch {
		case b.parts["content.xml"] != nil:
			return &formats.Error{Code: "not_workbook", What: "the file is an OpenDocument", Do: "save it as .xlsx or CSV"}
		case b.parts["xl/workbook.bin"] != nil:
			return &formats.Error{Code: "not_workbook", What: "the file is a binary workbook, .xlsb", Do: "save it as .xlsx or CSV"}
		}
		return &formats.Error{Code: "not_workbook", What: "the archive holds no workbook", Do: "choose an .xlsx file"}
	}
	if strings.HasSuffix(b.path, ".bin") {
		return &formats.Error{Code: "not_workbook", What: "the file is a binary workbook, .xlsb", Do: "save it as .xlsx or CSV"}
	}
	dir, file := path.Split(b.path)
	parts := map[string]relation{}
	if rels := dir + "_rels/" + file + ".rels"; b.parts[strings.ToLower(rels)] != nil {
		all, err := b.relations(rels, dir)
		if err != nil {
			return err
		}
		for _, r := range all {
			parts[r.id] = r
			if _, twice := b.related[r.kind]; !twice {
				b.related[r.kind] = r.part
			}
		}
	}
	x, err := b.part(b.path)
	if err != nil {
		return err
	}
	defer x.close()
	isWorkbook := false
	for {
		start, err := x.opening()
		if err != nil {
			return err
		}
		if start == nil {
			break
		}
		switch start.Name.Local {
		case "workbook":
			isWorkbook = true
		case "workbookPr":
			if truth(attr(start, "date1904")) {
				b.from = since1904
			}
		case "sheet":
			s := sheet{name: attr(start, "name"), hidden: attr(start, "state") == "hidden" || attr(start, "state") == "veryHidden"}
			for _, a := range start.Attr {
				if a.Name.Local == "id" && a.Name.Space != "" {
					if r, ok := parts[a.Value]; ok && r.kind == "worksheet" {
						s.part = r.part
					}
				}
			}
			if s.part != "" { // others are charts and macros
				b.sheets = append(b.sheets, s)
			}
		}
	}
	if !isWorkbook {
		return &formats.Error{Code: "not_workbook", What: "the archive holds no workbook", Do: "choose an .xlsx file"}
	}
	if len(b.sheets) == 0 {
		return &formats.Error{Code: "no_sheet", What: "the workbook has no sheet of cells", Do: doSave}
	}
	return nil
}

// relation leads from one part to another.
type relation struct {
	id, kind, part string
}

func (b *book) relations(name, dir string) ([]relation, error) {
	x, err := b.part(name)
	if err != nil {
		return nil, err
	}
	defer x.close()
	var out []relation
	for {
		start, err := x.opening()
		if err != nil || start == nil {
			return out, err
		}
		if start.Name.Local != "Relationship" || attr(start, "TargetMode") == "External" {
			continue
		}
		target := strings.ReplaceAll(attr(start, "Target"), `\`, "/")
		if !strings.HasPrefix(target, "/") {
			target = dir + target
		}
		out = append(out, relation{id: attr(start, "Id"), kind: path.Base(attr(start, "Type")), part: strings.TrimPrefix(path.Clean("/"+target), "/")})
	}
}

// content reads what cells refer to: texts that they share, and styles that say which numbers are dates.
func (b *book) content() error {
	if p := b.related["sharedStrings"]; b.parts[strings.ToLower(p)] != nil {
		if err := b.sharedTexts(p); err != nil {
			return err
		}
	}
	if p := b.related["styles"]; b.parts[strings.ToLower(p)] != nil {
		return b.readStyles(p)
	}
	return nil
}

func (b *book) sharedTexts(name string) error {
	x, err := b.part(name)
	if err != nil {
		return err
	}
	defer x.close()
	for {
		start, err := x.opening()
		if err != nil || start == nil {
			return err
		}
		if start.Name.Local != "si" {
			continue
		}
		if len(b.shared) >= maxShared {
			return &formats.Error{Code: "too_many", What: fmt.Sprintf("the workbook has more than %d texts", maxShared), Do: "split it"}
		}
		s, err := x.rich()
		if err != nil {
			return err
		}
		if err := b.keep(s); err != nil {
			return err
		}
		b.shared = append(b.shared, s)
	}
}

// keep counts the bytes of a text that is held.
func (b *book) keep(s string) error {
	if b.text += int64(len(s)); b.text > maxText {
		return &formats.Error{Code: "file_too_large", What: fmt.Sprintf("the texts of the workbook have more than %d bytes", maxText), Do: "split it"}
	}
	return nil
}

func (b *book) readStyles(name string) error {
	x, err := b.part(name)
	if err != nil {
		return err
	}
	defer x.close()
	own := map[string]string{}
	inCells := 0 // depth of the list of the cells' styles
	for {
		start, end, err := x.next()
		switch {
		case err != nil:
			return err
		case start == nil && end == "":
			return nil
		case start == nil:
			if end == "cellXfs" {
				inCells = 0
			}
		case start.Name.Local == "numFmt":
			own[attr(start, "numFmtId")] = attr(start, "formatCode")
		case start.Name.Local == "cellXfs":
			inCells = x.depth
		case start.Name.Local == "xf" && inCells > 0 && x.depth == inCells+1:
			id := attr(start, "numFmtId")
			form := notDate
			if code, ok := own[id]; ok {
				form = formOf(code)
			} else if n, err := strconv.Atoi(id); err == nil {
				form = builtIn(n)
			}
			b.styles = append(b.styles, form)
		}
	}
}
