package shapefile

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode/utf8"

	"groundtally/geo"
	"groundtally/geo/formats"
)

// Part is one file of a set.
type Part struct {
	io.ReaderAt
	Size int64
}

// Set is the files of one set, nil for one that is missing.
type Set struct{ SHP, DBF, SHX, PRJ, CPG *Part }

// Options say what is read and how much at most. A limit of zero is the default.
type Options struct {
	File     string            // name used in errors and notices
	Progress func(bytes int64) // bytes read of all files of the set
	Encoding string            // of the attributes' text, "Windows-1252" for one; empty finds out

	MaxFeatures  int // 5,000,000
	MaxPositions int // 100,000,000
}

const (
	maxValues = 100_000_000 // attributes of all features together
	maxSide   = 64 << 10    // bytes of a .prj or .cpg
)

// Ledger counts what became of the records. Read and LeftOut together are all of them.
type Ledger struct {
	Read     int // features in the layer
	LeftOut  int // records that are broken or marked as deleted
	Repaired int // features whose geometry was changed: rings closed, parts taken out
}

// Result is what a set holds.
type Result struct {
	Layer    *geo.Layer
	CRS      string // text of the .prj, "" without one
	Encoding string // of the attributes' text: "UTF-8", "Windows-1252" and so on; "" without a .dbf
	Notices  []geo.Notice
	Ledger   Ledger
}

// Decode reads a set. Features are identified by the numbers of their records, beginning with 1. Columns of
// numbers that hold something else, or whole numbers that no double holds exactly, become text; a cell that
// is blank is a missing value, as is a number of asterisks. Dates are text like "2026-02-01". A broken
// record is left out with a notice where the next one can still be found; otherwise nothing is taken.
func Decode(ctx context.Context, s Set, o Options) (Result, error) {
	if o.MaxFeatures <= 0 {
		o.MaxFeatures = 5_000_000
	}
	if o.MaxPositions <= 0 {
		o.MaxPositions = 100_000_000
	}
	d := &decoder{ctx: ctx, o: o, feed: &feed{ctx: ctx, progress: o.Progress}}
	res, err := d.decode(s)
	if err != nil {
		var e *formats.Error
		if errors.As(err, &e) {
			e.File = o.File
		}
		return Result{}, err
	}
	return res, nil
}

type decoder struct {
	ctx  context.Context
	o    Options
	feed *feed
	shp  *shapes
	dbf  *table // nil without one
	book book

	features  []geo.Feature
	positions int
	ledger    Ledger
	broken    error // the first record left out, for the case that none can be read
}

func (d *decoder) decode(s Set) (Result, error) {
	if err := d.ctx.Err(); err != nil {
		return Result{}, err
	}
	if s.SHP == nil {
		return Result{}, &formats.Error{Code: "shp_missing", What: "the .shp with the shapes is missing", Do: "put the .shp beside the other files of the set"}
	}
	var res Result
	var err error
	if d.shp, err = openShapes(d.feed, s.SHP); err != nil {
		return Result{}, err
	}
	if s.DBF != nil {
		if d.dbf, err = openTable(d.feed, s.DBF); err != nil {
			return Result{}, err
		}
	}
	if d.o.Encoding != "" && encodingOf(d.o.Encoding) == nil {
		return Result{}, &formats.Error{Code: "encoding_unknown", What: fmt.Sprintf("there is no encoding %q here", d.o.Encoding), Do: "name one of " + encodingNames()}
	}
	if err := d.records(s.SHX); err != nil {
		return Result{}, err
	}
	what := ""
	if res.CRS, what, err = d.side(s.PRJ); err != nil {
		return Result{}, err
	}
	if what != "" {
		d.book.add(key{code: "crs_not_understood", what: ".prj: " + what}, 0, 1)
	}
	if len(d.features) == 0 {
		if d.broken != nil {
			return Result{}, d.broken
		}
		d.book.note("layer_empty", 0, 1)
	}
	res.Layer = &geo.Layer{Features: d.features}
	if d.dbf == nil {
		d.book.note("attributes_missing", 0, 1)
	} else {
		enc, err := d.encoding(s.CPG)
		if err != nil {
			return Result{}, err
		}
		res.Encoding = enc.name
		if err := d.attributes(res.Layer, enc); err != nil {
			return Result{}, err
		}
	}
	if d.o.Progress != nil {
		d.o.Progress(d.feed.read)
	}
	d.ledger.Read = len(d.features)
	res.Ledger = d.ledger
	res.Notices = d.book.list(d.o.File, res.Layer.Columns)
	return res, nil
}

// side reads a small text file of the set whole; what says why it is none.
func (d *decoder) side(p *Part) (text, what string, err error) {
	if p == nil || p.Size <= 0 {
		return "", "", nil
	}
	if p.Size > maxSide {
		return "", fmt.Sprintf("%d bytes are too many", p.Size), nil
	}
	w := window{feed: d.feed, src: p}
	b, err := w.at(0, int(p.Size))
	if err != nil {
		return "", "", err
	}
	b = bytes.TrimSpace(bytes.TrimPrefix(b, []byte("\xef\xbb\xbf")))
	if bytes.IndexByte(b, 0) >= 0 {
		return "", "it is no text", nil
	}
	return strings.ToValidUTF8(string(b), string(utf8.RuneError)), "", nil
}

// errIndex says that the .shx cannot be trusted, found out while shapes are read by it.
var errIndex = errors.New("the index points beside the records")

// records reads all shapes with their rows.
func (d *decoder) records(shx *Part) error {
	why := ""
	if shx != nil {
		spans, bad, err := d.shp.index(shx)
		if err != nil {
			return err
		}
		if why = bad; bad == "" {
			if !d.shp.seamless(spans) {
				if why, err = d.shp.judge(spans); err != nil {
					return err
				}
			}
			if why == "" {
				err := d.run(&byIndex{spans: spans, strict: true})
				if !errors.Is(err, errIndex) {
					return err
				}
				if why, err = d.shp.judge(spans); err != nil {
					return err
				}
				if why == "" { // single records are broken, and the index leads past them
					return d.run(&byIndex{spans: spans})
				}
			}
		}
	}
	if err := d.run(&walk{}); err != nil {
		return err
	}
	if why != "" {
		d.book.add(key{code: "index_broken", what: why}, 0, 1)
	}
	return nil
}

// A guide leads from record to record.
type guide interface {
	// next gives the next record. A record that is broken has a text saying why, and the guide goes on
	// behind it.
	next(s *shapes) (at span, broken string, more bool, err error)
}

// run reads everything from the first record on.
func (d *decoder) run(g guide) error {
	d.book, d.features, d.positions, d.ledger, d.broken = book{}, nil, 0, Ledger{}, nil
	row := 0
	for {
		at, broken, more, err := g.next(d.shp)
		if err != nil {
			return err
		}
		if !more {
			break
		}
		row++
		if err := d.record(row, at, broken); err != nil {
			return err
		}
	}
	d.shp.told(d.book)
	if d.dbf == nil {
		return nil
	}
	if row != d.dbf.rows {
		d.book.note("rows_disagree", 0, 1).with("shapes", strconv.Itoa(row), "rows", strconv.Itoa(d.dbf.rows))
	}
	for row++; row <= d.dbf.rows; row++ {
		values, deleted, err := d.dbf.row(row, d.book)
		if err != nil {
			return err
		}
		if deleted {
			d.leaveOut("record_deleted", "", row)
			continue
		}
		d.book.note("geometry_missing", row, 1)
		if err := d.keep(row, geo.LonLatGeometry{}, values); err != nil {
			return err
		}
	}
	return nil
}

func (d *decoder) record(row int, at span, broken string) error {
	var content []byte
	var err error
	if broken == "" {
		if content, err = d.shp.content(at); err != nil {
			return err
		}
	}
	var values []geo.Value
	if d.dbf != nil && row <= d.dbf.rows {
		deleted := false
		if values, deleted, err = d.dbf.row(row, d.book); err != nil {
			return err
		}
		if deleted {
			d.leaveOut("record_deleted", "", row)
			return nil
		}
	}
	var s shape
	if broken == "" {
		broken = s.read(content, d.shp)
	}
	if broken == "" {
		if d.positions += s.positions; d.positions > d.o.MaxPositions {
			return d.tooMany(row, d.o.MaxPositions, "positions")
		}
		broken = s.build(content)
	}
	if broken != "" {
		if d.broken == nil {
			d.broken = &formats.Error{Where: "feature " + strconv.Itoa(row), Code: "bad_record", What: broken, Do: doCopy}
		}
		d.leaveOut("record_left_out", broken, row)
		return nil
	}
	g := geo.LonLatGeometry{}
	repeated := 0
	switch {
	case s.null:
		d.book.note("geometry_missing", row, 1)
	case s.kind == geo.Polygons && len(s.rings) > 0:
		g.Kind = geo.Polygons
		if g.Parts, repeated, err = nest(d.ctx, s.rings); err != nil {
			return err
		}
	default:
		g.Kind = s.kind
		for i := range s.rings {
			g.Parts = append(g.Parts, s.rings[i:i+1:i+1])
		}
		if len(s.rings) == 0 {
			d.book.note("geometry_empty", row, 1)
		}
	}
	for _, c := range [...]struct {
		code string
		n    int
	}{
		{"ring_closed", s.closed}, {"ring_repeated", repeated}, {"part_too_short", s.tooShort},
		{"height_left_out", s.heights}, {"measure_left_out", s.measures}, {"record_longer", s.surplus},
	} {
		if c.n > 0 {
			d.book.note(c.code, row, c.n)
		}
	}
	if s.closed+s.tooShort+repeated > 0 {
		d.ledger.Repaired++
	}
	return d.keep(row, g, values)
}

func (d *decoder) leaveOut(code, what string, row int) {
	d.book.add(key{code: code, what: what}, row, 1)
	d.ledger.LeftOut++
}

func (d *decoder) keep(row int, g geo.LonLatGeometry, values []geo.Value) error {
	columns := 0
	if d.dbf != nil {
		columns = len(d.dbf.fields)
	}
	if len(d.features) >= d.o.MaxFeatures {
		return d.tooMany(row, d.o.MaxFeatures, "features")
	}
	if (len(d.features)+1)*columns > maxValues {
		return d.tooMany(row, maxValues, "attributes of all features together")
	}
	if values == nil && columns > 0 {
		values = make([]geo.Value, columns)
	}
	d.features = append(d.features, geo.Feature{ID: strconv.Itoa(row), Geometry: g, Values: values})
	return nil
}

func (d *decoder) tooMany(row, limit int, of string) error {
	return &formats.Error{Where: "feature " + strconv.Itoa(row), Code: "too_many", What: fmt.Sprintf("the file has more than %d %s", limit, of), Do: "split it"}
}
