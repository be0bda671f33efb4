package asciigrid

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/raster"
)

// Options say how much is read at most. A limit of zero is the default.
type Options struct {
	File     string
	Progress func(bytes int64)
	MaxBytes int64 // 8 GiB
	MaxCells int   // 250,000,000: one gigabyte of values
}

// Result is what a file holds.
type Result struct {
	Grid    *raster.Grid
	Missing int // cells without a value
	Notices []geo.Notice
}

// Error says what is wrong with a grid, where, and what to do about it.
type Error struct {
	File   string
	Line   int // 1-based
	Offset int64
	Code   string // stable name of the fault
	What   string
	Do     string
	Err    error
}

func (e *Error) Error() string {
	s := ""
	if e.File != "" {
		s = e.File + ": "
	}
	s += fmt.Sprintf("line %d, byte %d: %s", e.Line, e.Offset, e.What)
	if e.Err != nil {
		s += ": " + e.Err.Error()
	}
	if e.Do != "" {
		s += "; " + e.Do
	}
	return s
}

func (e *Error) Unwrap() error { return e.Err }

const (
	blockBytes    = 64 << 10
	progressEvery = 1 << 20
	maxToken      = 400
	firstCells    = 1 << 20 // cells allocated on the word of the header alone
	usualNoData   = -9999   // what the form means by a header without nodata_value
	doExport      = "export the grid again as an ASCII grid"
)

// Decode reads a grid. Cells that are written as nan are only taken where the header says that nan
// means missing; they become the lowest float32.
func Decode(ctx context.Context, r io.Reader, o Options) (Result, error) {
	if o.MaxBytes <= 0 {
		o.MaxBytes = 8 << 30
	}
	if o.MaxCells <= 0 {
		o.MaxCells = 250_000_000
	}
	d := decoder{ctx: ctx, o: o, r: bufio.NewReaderSize(r, blockBytes), line: 1, head: map[string]float64{}}
	res, err := d.decode()
	if err != nil {
		var e *Error
		if errors.As(err, &e) {
			e.File = o.File
		}
		return Result{}, err
	}
	return res, nil
}

type decoder struct {
	ctx      context.Context
	o        Options
	r        *bufio.Reader
	at       int64
	reported int64
	line     int

	token     []byte
	tokenLine int
	tokenAt   int64

	head    map[string]float64
	nan     bool // nodata_value is nan
	point   bool // a decimal point was seen
	comma   bool // a decimal comma was seen
	notices []geo.Notice
}

func (d *decoder) fault(code, what, do string) *Error {
	return &Error{Line: d.tokenLine, Offset: d.tokenAt, Code: code, What: what, Do: do}
}

// next reads the next token; io.EOF when there is none.
func (d *decoder) next() error {
	d.token = d.token[:0]
	for {
		c, err := d.r.ReadByte()
		if err != nil {
			if errors.Is(err, io.EOF) {
				if len(d.token) > 0 {
					return nil
				}
				d.tokenLine, d.tokenAt = d.line, d.at
				return io.EOF
			}
			d.tokenLine, d.tokenAt = d.line, d.at
			e := d.fault("unreadable", "the file cannot be read on", "")
			e.Err = err
			return e
		}
		if len(d.token) == 0 {
			d.tokenLine, d.tokenAt = d.line, d.at
		}
		if d.at++; d.at > d.o.MaxBytes {
			return d.fault("file_too_large", fmt.Sprintf("the file is larger than %d bytes", d.o.MaxBytes), "cut it to the district")
		}
		if d.at-d.reported >= progressEvery {
			d.reported = d.at
			if d.o.Progress != nil {
				d.o.Progress(d.at)
			}
			if err := d.ctx.Err(); err != nil {
				return err
			}
		}
		switch c {
		case '\n', '\r', ' ', '\t':
			if c == '\n' {
				d.line++
			}
			if len(d.token) > 0 {
				return nil
			}
		case 0:
			return d.fault("not_text", "there is a zero byte, so the file is not a text grid", doExport)
		default:
			if len(d.token) >= maxToken {
				return d.fault("not_a_grid", "a word is too long to be a number", "choose an ASCII grid")
			}
			d.token = append(d.token, c)
		}
	}
}

// number reads the token as a number. A decimal comma is taken, but not beside a decimal point.
func (d *decoder) number(bits int) (float64, error) {
	s := string(d.token)
	if strings.Contains(s, ",") {
		if strings.Count(s, ",") > 1 || strings.Contains(s, ".") {
			return 0, d.fault("thousands", fmt.Sprintf("%q has thousand separators", s), "take them out")
		}
		s = strings.Replace(s, ",", ".", 1)
		d.comma = true
	} else if strings.Contains(s, ".") {
		d.point = true
	}
	if d.comma && d.point {
		return 0, d.fault("decimal_mixed", "some numbers have a decimal comma, others a decimal point", "write all with a point")
	}
	if strings.ContainsAny(s, "_xXpP") {
		return 0, d.fault("not_a_number", fmt.Sprintf("%q is not a number", s), doExport)
	}
	v, err := strconv.ParseFloat(s, bits)
	switch {
	case errors.Is(err, strconv.ErrRange):
		return 0, d.fault("number_too_large", s+" is too large", doExport)
	case err != nil || math.IsNaN(v) || math.IsInf(v, 0):
		return 0, d.fault("not_a_number", fmt.Sprintf("%q is not a number", s), doExport)
	}
	return v, nil
}

var keys = map[string]string{
	"ncols": "ncols", "nrows": "nrows",
	"xllcorner": "xllcorner", "yllcorner": "yllcorner",
	"xllcenter": "xllcenter", "yllcenter": "yllcenter", "xllcentre": "xllcenter", "yllcentre": "yllcenter",
	"cellsize": "cellsize", "dx": "dx", "dy": "dy",
	"nodata_value": "nodata", "nodata": "nodata",
}

func letter(c byte) bool { return c|0x20 >= 'a' && c|0x20 <= 'z' || c == '_' }

// header reads keys with their values and leaves the first value of the grid in the token.
func (d *decoder) header() error {
	for {
		err := d.next()
		if errors.Is(err, io.EOF) {
			if len(d.head) == 0 {
				return d.fault("empty_file", "the file is empty", doExport)
			}
			return nil
		}
		if err != nil {
			return err
		}
		if d.tokenAt == 0 {
			d.token = []byte(strings.TrimPrefix(string(d.token), "\ufeff"))
		}
		word := strings.ToLower(string(d.token))
		if word == "" || !letter(word[0]) || word == "nan" {
			return nil
		}
		key, known := keys[word]
		if !known {
			return d.fault("not_a_grid", fmt.Sprintf("%q is not a key of an ASCII grid", short(word)), "the header has ncols, nrows, xllcorner, yllcorner, cellsize; choose an ASCII grid")
		}
		if _, twice := d.head[key]; twice {
			return d.fault("key_twice", word+" stands twice", doExport)
		}
		if err := d.next(); err != nil {
			if errors.Is(err, io.EOF) {
				return d.fault("truncated", "the file ends behind "+word, "copy or download it again")
			}
			return err
		}
		if key == "nodata" && strings.EqualFold(string(d.token), "nan") {
			d.nan = true
			d.head[key] = -math.MaxFloat32
			continue
		}
		bits := 64
		if key == "nodata" {
			bits = 32
		}
		v, err := d.number(bits)
		if err != nil {
			return err
		}
		d.head[key] = v
	}
}

func short(s string) string {
	if len(s) > 40 {
		return s[:40] + "..."
	}
	return s
}

// place makes a grid without values from the header.
func (d *decoder) place() (*raster.Grid, error) {
	h := d.head
	has := func(k string) bool { _, ok := h[k]; return ok }
	for _, k := range []string{"ncols", "nrows"} {
		if !has(k) {
			return nil, d.fault("key_missing", "the header has no "+k, doExport)
		}
		if v := h[k]; v != math.Trunc(v) || v < 1 || v > math.MaxInt32 {
			return nil, d.fault("bad_header", fmt.Sprintf("%s is %g, not a whole number above 0", k, v), doExport)
		}
	}
	g := &raster.Grid{NCols: int(h["ncols"]), NRows: int(h["nrows"]), NoData: usualNoData}
	if int64(g.NCols)*int64(g.NRows) > int64(d.o.MaxCells) {
		return nil, d.fault("too_many", fmt.Sprintf("the grid has %d by %d cells, at most %d can be read", g.NCols, g.NRows, d.o.MaxCells), "cut it to the district")
	}
	switch {
	case has("cellsize") && !has("dx") && !has("dy"):
		g.CellX, g.CellY = h["cellsize"], h["cellsize"]
	case has("dx") && has("dy") && !has("cellsize"):
		g.CellX, g.CellY = h["dx"], h["dy"]
	default:
		return nil, d.fault("key_missing", "the header needs either cellsize or both dx and dy", doExport)
	}
	if g.CellX <= 0 || g.CellY <= 0 {
		return nil, d.fault("bad_header", fmt.Sprintf("the cell size is %g by %g, not above 0", g.CellX, g.CellY), doExport)
	}
	for _, side := range []struct {
		axis string
		cell float64
		to   *float64
	}{{"x", g.CellX, &g.XLL}, {"y", g.CellY, &g.YLL}} {
		corner, centre := side.axis+"llcorner", side.axis+"llcenter"
		switch {
		case has(corner) && !has(centre):
			*side.to = h[corner]
		case has(centre) && !has(corner):
			*side.to = h[centre] - side.cell/2
		default:
			return nil, d.fault("key_missing", "the header needs either "+corner+" or "+centre, doExport)
		}
	}
	if has("nodata") {
		g.NoData = h["nodata"]
	} else {
		d.notices = append(d.notices, geo.Notice{Code: "nodata_assumed", Severity: geo.Info, File: d.o.File, Args: map[string]string{"value": strconv.Itoa(usualNoData)}})
	}
	return g, nil
}

func (d *decoder) decode() (Result, error) {
	if err := d.header(); err != nil {
		return Result{}, err
	}
	g, err := d.place()
	if err != nil {
		return Result{}, err
	}
	n := g.NCols * g.NRows
	g.Values = make([]float32, 0, min(n, firstCells))
	missing := 0
	if len(d.token) > 0 { // the token is the first value unless the file ended
		for {
			if len(g.Values) == n {
				return Result{}, d.fault("values", fmt.Sprintf("%d by %d are %d values, but there are more", g.NCols, g.NRows, n), "ncols and nrows do not fit the values; "+doExport)
			}
			v, gap, err := d.value(g)
			if err != nil {
				return Result{}, err
			}
			if gap {
				missing++
			}
			g.Values = append(g.Values, v)
			if err := d.next(); errors.Is(err, io.EOF) {
				break
			} else if err != nil {
				return Result{}, err
			}
		}
	}
	if len(g.Values) < n {
		return Result{}, d.fault("values", fmt.Sprintf("%d by %d are %d values, but there are %d", g.NCols, g.NRows, n, len(g.Values)), "the file is cut short, or ncols and nrows do not fit; copy or export it again")
	}
	if d.comma {
		d.notices = append(d.notices, geo.Notice{Code: "decimal_comma", Severity: geo.Info, File: d.o.File})
	}
	if missing*2 > n {
		d.notices = append(d.notices, geo.Notice{Code: "mostly_missing", Severity: geo.Warning, File: d.o.File, Args: map[string]string{"count": strconv.Itoa(missing), "of": strconv.Itoa(n)}})
	}
	return Result{Grid: g, Missing: missing, Notices: d.notices}, nil
}

func (d *decoder) value(g *raster.Grid) (v float32, missing bool, err error) {
	if d.nan && strings.EqualFold(string(d.token), "nan") {
		return float32(g.NoData), true, nil
	}
	f, err := d.number(32)
	if err != nil {
		return 0, false, err
	}
	if float32(f) == float32(g.NoData) {
		if d.nan {
			return 0, false, d.fault("number_too_large", string(d.token)+" is too large", doExport)
		}
		return float32(f), true, nil
	}
	return float32(f), false, nil
}
