package hgt

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats"
	"groundtally/geo/raster"
)

// Options say what is read.
type Options struct {
	File     string            // its name places the tile: "N47E009.hgt"
	Progress func(bytes int64) // is told the bytes read so far, about once a megabyte
}

// Result is what a tile holds, in metres above the sea.
type Result struct {
	Grid    *raster.Grid
	CRS     string // always "EPSG:4326", longitude before latitude
	Missing int    // samples without a height
	Notices []geo.Notice
}

const (
	void         = -32768
	coarse, fine = 1201, 3601
)

var place = regexp.MustCompile(`^(?i:([NS])([0-9]{2})([EW])([0-9]{3}))(?:[^0-9]|$)`)

// Corner gives the south-west corner of the tile of a name, in whole degrees; folders before the name
// do not matter.
func Corner(name string) (lon, lat int, err error) {
	base := name[strings.LastIndexAny(name, `/\`)+1:]
	if m := place.FindStringSubmatch(base); m != nil {
		lat, lon = degrees(m[2], m[1], "S"), degrees(m[4], m[3], "W")
		if lat >= -90 && lat < 90 && lon >= -180 && lon < 180 {
			return lon, lat, nil
		}
	}
	return 0, 0, &formats.Error{File: name, Code: "no_place", What: "the name of the file does not say where its south-west corner is", Do: "give it the name that it was published under, N47E009.hgt for 47 degrees north, 9 degrees east"}
}

func degrees(digits, half, negative string) int {
	n, err := strconv.Atoi(digits)
	if err != nil {
		return math.MaxInt // the pattern lets digits alone through
	}
	if strings.EqualFold(half, negative) {
		return -n
	}
	return n
}

// Decode reads a tile of size bytes.
func Decode(ctx context.Context, r io.ReaderAt, size int64, o Options) (Result, error) {
	lon, lat, err := Corner(o.File)
	if err != nil {
		return Result{}, err
	}
	n := 0
	for _, side := range []int{coarse, fine} {
		if size == 2*int64(side)*int64(side) {
			n = side
		}
	}
	if n == 0 {
		return Result{}, &formats.Error{File: o.File, Code: "wrong_size", What: fmt.Sprintf("the file has %d bytes; a tile has %d (%d by %d samples) or %d (%d by %d)", size, 2*coarse*coarse, coarse, coarse, 2*fine*fine, fine, fine), Do: "unpack it if it is packed, or download it again"}
	}
	cell := 1 / float64(n-1)
	g := &raster.Grid{NCols: n, NRows: n, XLL: float64(lon) - cell/2, YLL: float64(lat) - cell/2, CellX: cell, CellY: cell, NoData: void, Values: make([]float32, 0, n*n)}
	missing, told := 0, int64(0)
	row := make([]byte, 2*n)
	for i := range n {
		if err := ctx.Err(); err != nil {
			return Result{}, err
		}
		if got, err := r.ReadAt(row, int64(i)*int64(len(row))); got < len(row) {
			e := &formats.Error{File: o.File, Where: fmt.Sprintf("row %d", i+1), Code: "truncated", What: "the file ends early", Do: "copy or download it again"}
			if err != nil && !errors.Is(err, io.EOF) {
				e.Code, e.What, e.Do, e.Err = "unreadable", "the file cannot be read on", "", err
			}
			return Result{}, e
		}
		for b := row; len(b) > 0; b = b[2:] {
			v := int16(binary.BigEndian.Uint16(b))
			if v == void {
				missing++
			}
			g.Values = append(g.Values, float32(v))
		}
		if done := int64(i+1) * int64(len(row)); o.Progress != nil && done-told >= 1<<20 {
			told = done
			o.Progress(done)
		}
	}
	res := Result{Grid: g, CRS: "EPSG:4326", Missing: missing}
	if missing*2 > n*n {
		res.Notices = append(res.Notices, geo.Notice{Code: "mostly_missing", Severity: geo.Warning, File: o.File, Args: map[string]string{"count": strconv.Itoa(missing), "of": strconv.Itoa(n * n)}})
	}
	return res, nil
}
