package geotiff

import (
	"bytes"
	"compress/zlib"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"groundtally/geo/formats"
)

// Numbers are marked, rounded and scaled by the rules of the doc comments.
func TestValues(t *testing.T) {
	le := binary.LittleEndian
	nan, inf := math.NaN(), math.Inf(1)
	scaled := func(scale, offset string) tagged {
		return words(tagMetadata, `<GDALMetadata><Item name="SCALE" sample="1" role="scale">9</Item><Item name="SCALE" sample="0" role="scale">`+scale+`</Item><Item name="OFFSET" sample="0" role="offset">`+offset+`</Item></GDALMetadata>`)
	}
	lowest := func(n int) (v []float32) {
		for i := range n {
			v = append(v, math.Float32frombits(math.Float32bits(-math.MaxFloat32)-uint32(i)))
		}
		return v
	}
	for name, c := range map[string]struct {
		tags    []tagged
		cells   []byte
		want    []float64 // NaN where missing
		noData  float64
		notices string
	}{
		"marked before rounding":     {plain(3, 1, 32, 2, words(tagNoData, "16777217")), int32s(le, 16777217, 16777216, 5), []float64{nan, 16777216, 5}, -math.MaxFloat32, ""},
		"marked and rounded":         {plain(3, 1, 32, 2, words(tagNoData, "16777217")), int32s(le, 16777217, 16777219, 5), []float64{nan, 16777220, 5}, 16777216, "digits_lost"},
		"double marked":              {plain(3, 1, 64, 3, words(tagNoData, "0.1")), doubles(le, 0.1, float64(float32(0.1)), 2), []float64{nan, float64(float32(0.1)), 2}, -math.MaxFloat32, ""},
		"double marked by a huge":    {plain(3, 1, 64, 3, words(tagNoData, "-1.7976931348623157e+308")), doubles(le, -math.MaxFloat64, 1, 2), []float64{nan, 1, 2}, -math.MaxFloat32, ""},
		"double too large":           {plain(3, 1, 64, 3), doubles(le, 1e300, 1, 2), []float64{nan, 1, 2}, -math.MaxFloat32, "values_infinite"},
		"infinite":                   {plain(4, 1, 32, 3), floats(le, float32(inf), float32(-inf), float32(nan), 2), []float64{nan, nan, nan, 2}, -math.MaxFloat32, "mostly_missing values_infinite"},
		"mark of few digits":         {plain(3, 1, 32, 3, words(tagNoData, "-3.40282e+38")), floats(le, -3.40282e38, 1, 2), []float64{nan, 1, 2}, float64(float32(-3.40282e38)), ""},
		"mark of too many digits":    {plain(3, 1, 32, 3, words(tagNoData, "-3.4028234663852886e+38")), floats(le, -math.MaxFloat32, 1, 2), []float64{nan, 1, 2}, -math.MaxFloat32, ""},
		"mark beyond all":            {plain(3, 1, 32, 3, words(tagNoData, "-1e400")), floats(le, float32(-inf), 1, 2), []float64{nan, 1, 2}, -math.MaxFloat32, ""},
		"mark with a comma":          {plain(3, 1, 32, 3, words(tagNoData, " -0,5 ")), floats(le, -0.5, 1, 2), []float64{nan, 1, 2}, -0.5, ""},
		"mark that is no number":     {plain(3, 1, 32, 3, words(tagNoData, "none")), floats(le, -0.5, 1, 2), []float64{-0.5, 1, 2}, -math.MaxFloat32, "nodata_unreadable"},
		"mark that is empty":         {plain(3, 1, 32, 3, words(tagNoData, "")), floats(le, -0.5, 1, 2), []float64{-0.5, 1, 2}, -math.MaxFloat32, ""},
		"mark beyond the type":       {plain(3, 1, 8, 1, words(tagNoData, "-9999")), []byte{1, 2, 255}, []float64{1, 2, 255}, -9999, ""},
		"minus zero is zero":         {plain(3, 1, 32, 3, words(tagNoData, "0")), floats(le, float32(math.Copysign(0, -1)), 0, 2), []float64{nan, nan, 2}, 0, "mostly_missing"},
		"the mark not stated":        {plain(3, 1, 16, 2), []byte{0, 0x80, 1, 0, 0, 0x80}, []float64{-32768, 1, -32768}, -math.MaxFloat32, "nodata_not_stated"},
		"the lowest is taken":        {plain(3, 1, 32, 3), floats(le, append(lowest(2), float32(nan))...), []float64{-math.MaxFloat32, float64(lowest(2)[1]), nan}, float64(lowest(3)[2]), "nodata_not_stated"},
		"scaled":                     {plain(3, 1, 16, 1, words(tagNoData, "7"), scaled("0.5", "-10")), []byte{7, 0, 8, 0, 34, 0}, []float64{nan, -6, 7}, -math.MaxFloat32, "values_scaled"},
		"scaled exactly":             {plain(2, 1, 32, 2, scaled("0.001", "0")), int32s(le, 123456789, -1), []float64{123456.789, -0.001}, -math.MaxFloat32, "values_scaled"},
		"scaled beyond all":          {plain(2, 1, 32, 3, scaled("1e30", "0")), floats(le, 1e30, 1), []float64{nan, 1e30}, -math.MaxFloat32, "values_infinite values_scaled"},
		"metadata that are not XML":  {plain(2, 1, 8, 1, words(tagMetadata, "<a <b")), []byte{1, 2}, []float64{1, 2}, -math.MaxFloat32, "metadata_unreadable"},
		"metadata that end early":    {plain(2, 1, 8, 1, words(tagMetadata, `<GDALMetadata><Item sample="0" role="scale">`)), []byte{1, 2}, []float64{1, 2}, -math.MaxFloat32, "metadata_unreadable"},
		"metadata of another letter": {plain(2, 1, 8, 1, words(tagMetadata, "<GDALMetadata>\xff</GDALMetadata>")), []byte{1, 2}, []float64{1, 2}, -math.MaxFloat32, ""},
		"undefined is unsigned":      {plain(2, 1, 8, 4), []byte{1, 200}, []float64{1, 200}, -math.MaxFloat32, ""},
		"more bytes than cells":      {plain(2, 1, 8, 1, long64(tagStripCounts, 5)), []byte{1, 2, 3, 4, 5}, []float64{1, 2}, -math.MaxFloat32, ""},
		"unknown vertical unit":      {plain(2, 1, 8, 1, words(tagMetadata, `<GDALMetadata><Item sample="0" role="unittype">fathom</Item></GDALMetadata>`)), []byte{1, 2}, []float64{1, 2}, -math.MaxFloat32, "vertical_unit_unknown"},
	} {
		t.Run(name, func(t *testing.T) {
			got, err := decodeBytes(little.withDoubleOffsets().file(c.cells, c.tags), Options{})
			if err != nil {
				t.Fatal(err)
			}
			compare(t, got, truth{len(c.want), 1, c.want})
			have := map[string]bool{}
			for _, n := range got.Notices {
				have[n.Code] = true
			}
			delete(have, "crs_not_stated")
			for _, want := range strings.Fields(c.notices) {
				if !have[want] {
					t.Errorf("no notice %s", want)
				}
				delete(have, want)
			}
			if len(have) > 0 || got.Grid.NoData != c.noData {
				t.Errorf("further notices %v, missing is %g", have, got.Grid.NoData)
			}
		})
	}
	_, err := decodeBytes(little.withDoubleOffsets().file(floats(le, lowest(spare)...), plain(spare, 1, 32, 3)), Options{})
	if code(err) != "no_mark" {
		t.Errorf("error %v", err)
	}
}

// withDoubleOffsets gives a maker of big files, whose offsets fit those of plain.
func (m maker) withDoubleOffsets() maker { return maker{m.order, true} }

func code(err error) string {
	var e *formats.Error
	if errors.As(err, &e) && e.Do != "" {
		return e.Code
	}
	return fmt.Sprint(err)
}

// Places that a file may state, the cells 2 by 1.
func TestPlace(t *testing.T) {
	keys := func(v ...uint64) tagged { return short16(tagGeoKeys, v...) }
	none := func(tags []tagged, ids ...uint16) (out []tagged) {
		for _, t := range tags {
			keep := true
			for _, id := range ids {
				keep = keep && t.id != id
			}
			if keep {
				out = append(out, t)
			}
		}
		return out
	}
	p := func(more ...tagged) []tagged { return plain(2, 1, 8, 1, more...) }
	noPlace := func(more ...tagged) []tagged { return append(none(p(), tagPixelScale, tagTiepoint), more...) }
	matrix := func(a, b, d, e, f, h float64) tagged {
		return double(tagMatrix, a, b, 0, d, e, f, 0, h, 0, 0, 0, 0, 0, 0, 0, 1)
	}
	for name, c := range map[string]struct {
		tags []tagged
		code string // of the fault, or "" and where the grid lies
		xll  float64
		yll  float64
		crs  string
	}{
		"plain":                   {p(), "", 500000, 5316850, ""},
		"tied elsewhere":          {p(double(tagTiepoint, 1, 2, 0, 500025, 5316825, 0)), "", 500000, 5316850, ""},
		"point":                   {p(keys(1, 1, 0, 1, 1025, 0, 1, 2)), "", 499987.5, 5316862.5, ""},
		"matrix":                  {noPlace(matrix(25, 0, 500000, 0, -25, 5316875)), "", 500000, 5316850, ""},
		"matrix south up":         {noPlace(matrix(25, 0, 500000, 0, 25, 5316850)), "", 500000, 5316850, ""},
		"matrix south up, point":  {noPlace(matrix(25, 0, 500012.5, 0, 25, 5316862.5), keys(1, 1, 0, 1, 1025, 0, 1, 2)), "", 500000, 5316850, ""},
		"matrix of rounding":      {noPlace(matrix(25, 1e-9, 500000, -1e-9, -25, 5316875)), "", 500000, 5316850, ""},
		"scale before matrix":     {p(matrix(1, 0, 0, 0, -1, 0)), "", 500000, 5316850, ""},
		"turned":                  {noPlace(matrix(0, 25, 500000, 25, 0, 5316875)), "turned", 0, 0, ""},
		"sheared":                 {noPlace(matrix(25, 1, 500000, 0, -25, 5316875)), "turned", 0, 0, ""},
		"mirrored":                {noPlace(matrix(-25, 0, 500000, 0, -25, 5316875)), "mirrored", 0, 0, ""},
		"height below 0":          {p(double(tagPixelScale, 25, -25, 0)), "mirrored", 0, 0, ""},
		"flat":                    {noPlace(matrix(25, 0, 500000, 0, 0, 5316875)), "no_place", 0, 0, ""},
		"no size":                 {p(double(tagPixelScale, 0, 0, 0)), "no_place", 0, 0, ""},
		"far away":                {p(double(tagTiepoint, 0, 0, 0, 1e300, 0, 0)), "no_place", 0, 0, ""},
		"too far":                 {p(double(tagPixelScale, 1e308, 1e308, 0)), "no_place", 0, 0, ""},
		"not a number":            {p(double(tagPixelScale, math.NaN(), 25, 0)), "bad_header", 0, 0, ""},
		"half a tie":              {p(double(tagTiepoint, 0, 0, 0)), "no_place", 0, 0, ""},
		"nothing":                 {noPlace(), "no_place", 0, 0, ""},
		"control points":          {noPlace(double(tagTiepoint, make([]float64, 24)...)), "control_points", 0, 0, ""},
		"keys cut short":          {p(keys(1, 1, 0, 9, 1024, 0, 1, 1)), "bad_header", 0, 0, ""},
		"keys without a head":     {p(keys(1, 1)), "bad_header", 0, 0, ""},
		"projected":               {p(keys(1, 1, 0, 3, 1024, 0, 1, 1, 2048, 0, 1, 4258, 3072, 0, 1, 25832)), "", 500000, 5316850, "EPSG:25832"},
		"projected, unsaid":       {p(keys(1, 1, 0, 1, 3072, 0, 1, 25832)), "", 500000, 5316850, "EPSG:25832"},
		"geographic":              {p(keys(1, 1, 0, 2, 1024, 0, 1, 2, 2048, 0, 1, 4326)), "", 500000, 5316850, "EPSG:4326"},
		"geographic, unsaid":      {p(keys(1, 1, 0, 1, 2048, 0, 1, 4326)), "", 500000, 5316850, "EPSG:4326"},
		"of its own":              {p(keys(1, 1, 0, 3, 1024, 0, 1, 1, 2048, 0, 1, 4258, 3072, 0, 1, 32767)), "", 500000, 5316850, ""},
		"of its own, unsaid":      {p(keys(1, 1, 0, 2, 2048, 0, 1, 4258, 3072, 0, 1, 32767)), "", 500000, 5316850, ""},
		"private":                 {p(keys(1, 1, 0, 2, 1024, 0, 1, 1, 3072, 0, 1, 40000)), "", 500000, 5316850, ""},
		"from the earth's core":   {p(keys(1, 1, 0, 2, 1024, 0, 1, 3, 2048, 0, 1, 4978)), "", 500000, 5316850, ""},
		"citation behind the end": {p(keys(1, 1, 0, 2, 1024, 0, 1, 1, 1026, 34737, 9, 900), words(tagGeoTexts, "x|")), "", 500000, 5316850, ""},
	} {
		t.Run(name, func(t *testing.T) {
			got, err := decodeBytes(little.withDoubleOffsets().file([]byte{1, 2}, c.tags), Options{})
			if c.code != "" {
				if code(err) != c.code {
					t.Errorf("error %v", err)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			g := got.Grid
			if g.XLL != c.xll || g.YLL != c.yll || g.CellX != 25 || g.CellY != 25 || got.CRS != c.crs || (c.crs == "") != strings.HasPrefix(codes(got), "crs_") {
				t.Errorf("%+v, %q, %s", g, got.CRS, codes(got))
			}
		})
	}
}

func TestBrokenHeaders(t *testing.T) {
	big := little.withDoubleOffsets()
	ok := func(more ...tagged) []byte { return big.file([]byte{1, 2, 3, 4}, plain(2, 2, 8, 1, more...)) }
	patched := func(b []byte, at int, v ...byte) []byte { copy(b[at:], v); return b }
	tile := []tagged{long32(tagTileWidth, 16), long32(tagTileHeight, 16), long32(tagTileOffsets, 1), long32(tagTileCounts, 256)}
	var many [][]tagged
	for range maxImages + 1 {
		many = append(many, []tagged{long32(tagSubfile, 1)})
	}
	var crowd []tagged
	for i := range maxEntries + 1 {
		crowd = append(crowd, short16(uint16(i), 1))
	}
	for name, c := range map[string]struct {
		in   []byte
		code string
	}{
		"empty":                {nil, "empty_file"},
		"short":                {[]byte("II*"), "not_tiff"},
		"text":                 {[]byte("ncols 3\nnrows 2\n"), "not_tiff"},
		"other version":        {[]byte("II\x2c\x00\x08\x00\x00\x00"), "not_tiff"},
		"big and short":        {[]byte("II+\x00\x08\x00\x00\x00"), "truncated"},
		"offsets of 16":        {patched(ok(), 4, 16), "bad_header"},
		"no image":             {[]byte("II*\x00\x00\x00\x00\x00"), "bad_header"},
		"image behind the end": {[]byte("II*\x00\xff\xff\x00\x00"), "truncated"},
		"circle":               {patchNext(big.file(nil, plain(2, 2, 8, 1), plain(2, 2, 8, 1))), "bad_header"},
		"to itself":            {patchNext(ok()), "bad_header"},
		"many images":          {big.file(nil, many...), "too_many"},
		"many tags":            {big.file(nil, crowd), "bad_header"},
		"endless tags":         {patched(ok(), 16, 255, 255, 255, 255, 255, 255, 255, 127), "bad_header"},
		"overviews alone":      {big.file(nil, []tagged{long32(tagSubfile, 1)}, []tagged{long32(tagSubfile, 4)}, []tagged{short16(tagOldSubfile, 2)}), "bad_header"},
		"no columns":           {ok(long32(tagWidth, 0)), "bad_header"},
		"columns beyond all":   {ok(long64(tagWidth, 1<<40)), "bad_header"},
		"columns as text":      {ok(words(tagWidth, "2")), "bad_header"},
		"columns of no type":   {ok(tagged{id: tagWidth, typ: 99, whole: []uint64{2}}), "bad_header"},
		"no bands":             {ok(short16(tagSamples, 0)), "bad_header"},
		"bands beyond all":     {ok(long32(tagSamples, 1<<20)), "bad_header"},
		"planar of 3":          {ok(short16(tagPlanar, 3)), "bad_header"},
		"strips of no rows":    {ok(short16(tagRowsPerStrip, 0)), "bad_header"},
		"tiles of no columns":  {ok(append(tile, long32(tagTileWidth, 0))...), "bad_header"},
		"tiles beyond all":     {ok(append(tile, long32(tagTileWidth, 1<<20))...), "block_too_large"},
		"rows beyond all":      {ok(long32(tagWidth, 1<<25)), "block_too_large"},
		"predictor 9":          {ok(short16(tagPredictor, 9), short16(tagCompression, 8)), "predictor"},
		"predictor 3 of bytes": {ok(short16(tagPredictor, 3), short16(tagCompression, 8)), "predictor"},
		"bits reversed":        {ok(short16(tagFillOrder, 2)), "sample"},
		"bands of two depths":  {ok(short16(tagSamples, 2), short16(tagBits, 8, 16)), "sample"},
		"compression of ours":  {ok(short16(tagCompression, 60000)), "compression"},
		"YCbCr":                {ok(short16(tagPhotometric, 6), short16(tagSamples, 3)), "picture"},
		"no offsets":           {ok(tagged{id: tagStripOffsets, typ: 4}), "bad_header"},
		"no counts":            {ok(tagged{id: tagStripCounts, typ: 4}), "bad_header"},
		"all left out":         {ok(long64(tagStripCounts, 0)), "no_values"},
		"strip behind the end": {ok(long64(tagStripOffsets, 1<<40)), "truncated"},
		"strip over the end":   {ok(long64(tagStripCounts, 1<<40)), "truncated"},
		"strip around the end": {ok(long64(tagStripCounts, math.MaxUint64)), "truncated"},
		"strip too short":      {ok(long64(tagStripCounts, 3)), "damaged"},
		"not deflated":         {ok(short16(tagCompression, 8)), "damaged"},
		"not packed by LZW":    {ok(short16(tagCompression, 5)), "damaged"},
		"scale of nothing":     {ok(words(tagMetadata, `<a><Item sample="0" role="scale">0</Item></a>`)), "bad_header"},
		"scale of no number":   {ok(words(tagMetadata, `<a><Item sample="0" role="scale">x</Item></a>`)), "bad_header"},
		"offset without end":   {ok(words(tagMetadata, `<a><Item sample="0" role="offset">inf</Item></a>`)), "bad_header"},
		"mark that is long":    {ok(words(tagNoData, strings.Repeat(" ", maxText+1))), "bad_header"},
		"mark in numbers":      {ok(short16(tagNoData, 7)), "bad_header"},
		"place in numbers":     {ok(long32(tagPixelScale, 1, 1, 1)), "bad_header"},
	} {
		t.Run(name, func(t *testing.T) {
			got, err := decodeBytes(c.in, Options{File: "t.tif"})
			if code(err) != c.code || !strings.HasPrefix(err.Error(), "t.tif: ") {
				t.Errorf("error %v, %+v", err, got.Grid)
			}
		})
	}
	// A tag may promise more values than the file has bytes; one that is not asked for does no harm.
	if _, err := decodeBytes(ok(tagged{id: 60000, typ: 99, whole: []uint64{1}}), Options{}); err != nil {
		t.Error(err)
	}
}

// patchNext makes the last image of a big file be followed by the first.
func patchNext(b []byte) []byte {
	at := uint64(16)
	for {
		next := at + 8 + 20*binary.LittleEndian.Uint64(b[at:])
		if at = binary.LittleEndian.Uint64(b[next:]); at == 0 {
			binary.LittleEndian.PutUint64(b[next:], 16)
			return b
		}
	}
}

// taken runs f and gives the bytes that it allocated in all.
func taken(f func()) uint64 {
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	f()
	runtime.ReadMemStats(&after)
	return after.TotalAlloc - before.TotalAlloc
}

func deflated(b []byte) []byte {
	var out bytes.Buffer
	z := zlib.NewWriter(&out)
	z.Write(b)
	z.Close()
	return out.Bytes()
}

// A header that promises a gigabyte of values must not make the program ask for it.
func TestPromisesAreNotAllocated(t *testing.T) {
	big := little.withDoubleOffsets()
	const side = 15000
	promise := func(more ...tagged) []tagged { return plain(side, side, 32, 3, more...) }
	tiles := []tagged{long32(tagTileWidth, 4096), long32(tagTileHeight, 4096), {id: tagTileOffsets, typ: 16, whole: make([]uint64, 16), blocks: true}, long32(tagTileCounts, make([]uint64, 16)...)}
	tiles[2].whole[3], tiles[3].whole[3] = 1, 4
	patch := big.file([]byte("abcd"), promise(tiles...))
	for name, in := range map[string][]byte{
		"plain":          big.file([]byte("abcd"), promise()),
		"plain, counted": big.file([]byte("abcd"), promise(long64(tagStripCounts, 4))),
		"deflate":        big.file(deflated([]byte("abcd")), promise(short16(tagCompression, 8), long64(tagStripCounts, 12))),
		"LZW":            big.file([]byte{0x80, 0, 0, 0}, promise(short16(tagCompression, 5), long64(tagStripCounts, 4))),
		"left out":       big.file(nil, promise(tagged{id: tagStripOffsets, typ: 16, whole: []uint64{0}})),
		"one tile":       patch,
		"many values":    patchCount(big.file([]byte("abcd"), promise()), tagStripOffsets, 1<<60),
		"fewer values":   patchCount(big.file([]byte("abcd"), promise(short16(tagRowsPerStrip, 1))), tagStripOffsets, 1<<60),
	} {
		var err error
		if n := taken(func() { _, err = decodeBytes(in, Options{}) }); n > 1<<20 || err == nil {
			t.Errorf("%s: %d bytes were allocated for a file of %d, error %v", name, n, len(in), err)
		}
	}
	// A block that holds more than its cells is read to its last cell.
	bomb := deflated(make([]byte, 64<<20))
	in := big.file(bomb, plain(2, 2, 32, 3, short16(tagCompression, 8), long64(tagStripCounts, uint64(len(bomb)))))
	var err error
	if n := taken(func() { _, err = decodeBytes(in, Options{}) }); n > 1<<20 || err != nil {
		t.Errorf("%d bytes were allocated, error %v", n, err)
	}
}

// patchCount changes the number of values that a tag of a big file promises.
func patchCount(b []byte, tag uint16, n uint64) []byte {
	for at := 24; at < len(b); at += 20 {
		if binary.LittleEndian.Uint16(b[at:]) == tag {
			binary.LittleEndian.PutUint64(b[at+4:], n)
			return b
		}
	}
	panic("no such tag")
}

// A flipped bit in the data of a block is found by the sum behind it.
func TestDamageIsFound(t *testing.T) {
	var stored bytes.Buffer
	z, err := zlib.NewWriterLevel(&stored, zlib.NoCompression)
	if err != nil {
		t.Fatal(err)
	}
	z.Write([]byte{1, 2, 3, 4})
	z.Close()
	b := stored.Bytes()
	tags := plain(2, 2, 8, 1, short16(tagCompression, 8), long64(tagStripCounts, uint64(len(b))))
	if _, err := decodeBytes(little.withDoubleOffsets().file(b, tags), Options{}); err != nil {
		t.Fatal(err)
	}
	b[8] ^= 1
	if _, err := decodeBytes(little.withDoubleOffsets().file(b, tags), Options{}); code(err) != "damaged" || !strings.Contains(err.Error(), "strip 1 of 1") {
		t.Errorf("error %v", err)
	}
}

// Files with something behind the last block of the first band.
var further = map[string]bool{"cog": true, "overviews": true, "mask": true, "two-images": true, "bands-planar": true}

// A file that is cut short is refused wherever the cut is, save behind the last block of values.
func TestTruncated(t *testing.T) {
	names, err := filepath.Glob(filepath.Join(folder, "*.tif"))
	if err != nil || len(names) < 90 {
		t.Fatal(len(names), err)
	}
	for _, name := range names {
		base := filepath.Base(name)
		b := load(t, base)
		if _, err := decodeBytes(b, Options{}); err != nil {
			continue
		}
		step := max(1, len(b)/150)
		for n := len(b) - 1; n >= 0; n -= step {
			if _, err := decodeBytes(b[:n], Options{}); err == nil && !further[strings.TrimSuffix(base, ".tif")] {
				t.Errorf("%s cut to %d of %d bytes is read", base, n, len(b))
				break
			}
		}
	}
}

// Flipped bytes anywhere never end the program, nor take memory beyond the bounds.
func TestFlippedBytes(t *testing.T) {
	names, err := filepath.Glob(filepath.Join(folder, "*.tif"))
	if err != nil {
		t.Fatal(err)
	}
	const most = 1 << 18
	random := rand.New(rand.NewPCG(7, 11))
	for _, name := range names {
		whole, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		for range 60 {
			b := bytes.Clone(whole)
			for range 1 + random.IntN(4) {
				at := random.IntN(len(b))
				if random.IntN(2) == 0 {
					at = random.IntN(min(len(b), 500)) // the header more often
				}
				b[at] = byte(random.Uint32())
			}
			var got Result
			n := taken(func() { got, err = decodeBytes(b, Options{MaxCells: most}) })
			if n > 4*most+(24<<20) {
				t.Errorf("%s: %d bytes were allocated", filepath.Base(name), n)
			}
			if err == nil {
				wellFormed(t, got)
			} else if code(err) == fmt.Sprint(err) {
				t.Errorf("%s: error without a code or a cure: %v", filepath.Base(name), err)
			}
		}
	}
}

func wellFormed(t *testing.T, r Result) {
	t.Helper()
	g := r.Grid
	if len(g.Values) != g.NCols*g.NRows || g.CellX <= 0 || g.CellY <= 0 || float64(float32(g.NoData)) != g.NoData {
		t.Fatalf("%+v", r)
	}
	missing := 0
	for _, v := range g.Values {
		if f := float64(v); math.IsNaN(f) || math.IsInf(f, 0) {
			t.Fatalf("value %g", v)
		}
		if v == float32(g.NoData) {
			missing++
		}
	}
	if missing != r.Missing {
		t.Fatalf("%d cells are missing, %d are said to be", missing, r.Missing)
	}
}

type brokenReader struct {
	io.ReaderAt
	from int64
	err  error
}

func (r brokenReader) ReadAt(p []byte, off int64) (int, error) {
	if off >= r.from {
		return 0, r.err
	}
	return r.ReaderAt.ReadAt(p, off)
}

func TestReaderFailsAndCancel(t *testing.T) {
	b := load(t, "one-strip.tif")
	out := errors.New("pulled out")
	var e *formats.Error
	for _, from := range []int64{0, 300} {
		if _, err := Decode(context.Background(), brokenReader{bytes.NewReader(b), from, out}, int64(len(b)), Options{File: "f"}); !errors.Is(err, out) || !errors.As(err, &e) || e.Code != "unreadable" || e.File != "f" {
			t.Errorf("from %d: error %v", from, err)
		}
		if _, err := Decode(context.Background(), brokenReader{bytes.NewReader(b), from, io.EOF}, int64(len(b)), Options{}); code(err) != "truncated" {
			t.Errorf("from %d: error %v", from, err)
		}
	}
	stop, cancel := context.WithCancel(context.Background())
	in := little.withDoubleOffsets().file(make([]byte, 9_000_000), plain(3000, 3000, 8, 1, short16(tagRowsPerStrip, 3000)))
	seen := int64(0)
	if _, err := Decode(stop, bytes.NewReader(in), int64(len(in)), Options{Progress: func(n int64) {
		if seen = n; n > 2<<20 {
			cancel()
		}
	}}); !errors.Is(err, context.Canceled) || seen > 4<<20 {
		t.Errorf("%v after %d bytes", err, seen)
	}
	if _, err := Decode(stop, bytes.NewReader(in), int64(len(in)), Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

func FuzzDecode(f *testing.F) {
	names, err := filepath.Glob(filepath.Join(folder, "*.tif"))
	if err != nil {
		f.Fatal(err)
	}
	for _, name := range names {
		b, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(b)
	}
	f.Fuzz(func(t *testing.T, b []byte) {
		o := Options{MaxCells: 1 << 18}
		got, err := decodeBytes(b, o)
		h, infoErr := Info(bytes.NewReader(b), int64(len(b)), o)
		if err != nil {
			return
		}
		wellFormed(t, got)
		if infoErr != nil || h.Refused != nil || h.Cols != got.Grid.NCols || h.Rows != got.Grid.NRows || h.CRS != got.CRS {
			t.Fatalf("%+v, %v, %+v", h, infoErr, got.Grid)
		}
	})
}
