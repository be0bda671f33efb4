package geotiff

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"

	"groundtally/geo"
	"groundtally/geo/formats"
	"groundtally/geo/raster"
)

// Options say what is read. A limit of zero is the default.
type Options struct {
	File     string
	Progress func(bytes int64) // is told the bytes read so far, about once a megabyte
	MaxCells int               // 250,000,000: one gigabyte of values
	Metres   bool              // turn values in feet into metres, where the file states feet
}

// Result is what a file holds.
type Result struct {
	Grid         *raster.Grid
	CRS          string  // "EPSG:25832"; empty where the file gives no code
	VerticalCRS  string  // "EPSG:7837"; empty where the file gives no code
	VerticalUnit string  // of the file: "metre", "foot", "US survey foot", another in the file's words; empty where not stated
	VerticalToM  float64 // metres in a VerticalUnit; 0 where it is not stated or not known
	Bands        int     // in the file; the first is in Grid
	Missing      int     // cells without a value
	Notices      []geo.Notice
}

// Decode reads the first band of the first full image. Size is the length of the file in bytes. Memory
// for values is taken only when every block that the file does not leave out is there, with enough bytes
// for its cells; cells of blocks that are left out count towards Options.MaxCells alone.
//
// Cells that are not finite numbers, or not finite as a float32, are missing. Values keep the unit of
// the file unless Options.Metres is set; a scale and an offset that the file states are applied.
func Decode(ctx context.Context, r io.ReaderAt, size int64, o Options) (Result, error) {
	res, err := decode(ctx, r, size, o)
	return res, named(err, o.File)
}

// Info reads the header alone, also of files that Decode refuses.
func Info(r io.ReaderAt, size int64, o Options) (Header, error) {
	_, h, err := open(r, size, &o)
	if err != nil {
		return Header{}, named(err, o.File)
	}
	h.Refused = named(h.Refused, o.File)
	return h.Header, nil
}

func named(err error, file string) error {
	var e *formats.Error
	if errors.As(err, &e) {
		e.File = file
	}
	return err
}

func fault(code, where, what, do string) *formats.Error {
	return &formats.Error{Code: code, Where: where, What: what, Do: do}
}

const (
	doCopy    = "copy or download it again"
	doDeflate = "save it again with Deflate compression"
	doGrid    = "save it again as a GeoTIFF with Float32 values"
	doCut     = "cut it to the district"
	doPlace   = "save it again with its place, or save it as an ASCII grid, which has one"
)

func open(r io.ReaderAt, size int64, o *Options) (*file, *header, error) {
	if o.MaxCells <= 0 {
		o.MaxCells = 250_000_000
	}
	f, err := newFile(r, size)
	if err != nil {
		return nil, nil, err
	}
	h, err := f.header(*o)
	return f, h, err
}

func decode(ctx context.Context, r io.ReaderAt, size int64, o Options) (Result, error) {
	if err := ctx.Err(); err != nil {
		return Result{}, err
	}
	f, h, err := open(r, size, &o)
	if err != nil {
		return Result{}, err
	}
	if h.Refused != nil {
		return Result{}, h.Refused
	}
	d := decoder{ctx: ctx, file: f, header: h, o: o}
	if err := d.blocks(); err != nil {
		return Result{}, err
	}
	g := &raster.Grid{NCols: h.Cols, NRows: h.Rows, XLL: h.Transform[0], YLL: h.Transform[3], CellX: h.Transform[1], CellY: math.Abs(h.Transform[5])}
	if !d.southUp() {
		g.YLL += float64(h.Rows) * h.Transform[5]
	}
	if err := d.read(g); err != nil {
		return Result{}, err
	}
	res := Result{Grid: g, CRS: h.CRS, VerticalCRS: h.VerticalCRS, VerticalUnit: h.VerticalUnit, VerticalToM: h.VerticalToM, Bands: h.Bands}
	if res.Missing, err = d.settle(g); err != nil {
		return Result{}, err
	}
	res.Notices = d.Notices
	return res, nil
}

// spare counts the lowest float32 that are kept in mind as marks for missing cells.
const spare = 64

// settle chooses the number that means missing, puts it where NaN stands, and counts the missing.
// It is the number that the file states unless a cell that is not missing became the same by rounding
// or scaling; else it is the lowest float32 that does not occur.
func (d *decoder) settle(g *raster.Grid) (missing int, err error) {
	lowest := math.Float32bits(-math.MaxFloat32)
	var used [spare]bool
	stated := float32(math.NaN())
	if d.HasNoData {
		stated = float32(d.NoData)
	}
	taken := false
	least, leastCount := float32(math.Inf(1)), 0
	for _, v := range g.Values {
		if v != v {
			missing++
			continue
		}
		if v == stated {
			taken = true
		}
		if v <= least {
			if v < least {
				least, leastCount = v, 0
			}
			leastCount++
		}
		if k := lowest - math.Float32bits(v); k < spare {
			used[k] = true
		}
	}
	mark := stated
	if taken || mark != mark || math.IsInf(float64(mark), 0) {
		k := 0
		for k < spare && used[k] {
			k++
		}
		if k == spare {
			return 0, fault("no_mark", "", "the lowest numbers that are possible all occur, so none is left to mark missing cells", "correct the values")
		}
		mark = math.Float32frombits(lowest - uint32(k))
	}
	g.NoData = float64(mark)
	if missing > 0 {
		for i, v := range g.Values {
			if v != v {
				g.Values[i] = mark
			}
		}
	}
	cells := len(g.Values)
	if missing*2 > cells {
		d.note("mostly_missing", geo.Warning, "count", strconv.Itoa(missing), "of", strconv.Itoa(cells))
	}
	if d.lost > 0 {
		d.note("digits_lost", geo.Warning, "count", strconv.Itoa(d.lost))
	}
	if d.infinite > 0 {
		d.note("values_infinite", geo.Warning, "count", strconv.Itoa(d.infinite))
	}
	if !d.HasNoData {
		if d.sparse > 0 {
			d.note("blocks_left_out", geo.Warning, "count", strconv.Itoa(d.sparse))
		}
		if leastCount > 0 && usualMark(least) {
			d.note("nodata_not_stated", geo.Warning, "value", strconv.FormatFloat(float64(least), 'g', -1, 32), "count", strconv.Itoa(leastCount))
		}
	}
	return missing, nil
}

// usualMark reports whether a least value is one that many programs write for missing cells.
func usualMark(v float32) bool {
	switch v {
	case -9999, -99999, -32767, -32768, math.MinInt32:
		return true
	}
	return v < -1e30
}

func sampleName(k sampleKind, bits uint64) string {
	switch {
	case k == unsigned && bits == 8:
		return "Byte"
	case k == unsigned:
		return fmt.Sprintf("UInt%d", bits)
	case k == signed:
		return fmt.Sprintf("Int%d", bits)
	case k == floating:
		return fmt.Sprintf("Float%d", bits)
	}
	return fmt.Sprintf("complex numbers of %d bits", bits)
}
