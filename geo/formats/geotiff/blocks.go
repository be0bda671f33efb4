package geotiff

import (
	"bufio"
	"compress/zlib"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"

	"golang.org/x/image/tiff/lzw"

	"groundtally/geo/formats"
	"groundtally/geo/raster"
)

// A decoder turns the blocks of a file into cells.
type decoder struct {
	*file
	*header
	ctx context.Context
	o   Options

	offsets, counts table
	src             source
	in              *bufio.Reader
	z               io.ReadCloser

	row, other []byte    // a row of a block; room to put its bytes in order
	cells      []float64 // the first band of a row, as stored

	sparse, lost, infinite int
}

// The most bytes that a byte of compressed data can stand for, rounded up. Deflate: a match of 258
// bytes in 2 bits. LZW: a code of 12 bits for a text that grew by a byte with each of 3,838 codes.
const (
	deflateMost = 1033
	lzwMost     = 2600
)

// Blocks that are alike may stand in the file once. All together they have at most this many times its
// size, so that the work is bounded by the size too.
const maxShared = 4

func (d *decoder) blockName(i int) string {
	kind := "strip"
	if d.tiled {
		kind = "tile"
	}
	return fmt.Sprintf("%s %d of %d", kind, i+1, d.across*d.down)
}

// blockRows gives the rows of a block that are stored. Strips end with the image, tiles do not.
func (d *decoder) blockRows(by int) int {
	if d.tiled {
		return d.blockH
	}
	return min(d.blockH, d.Rows-by*d.blockH)
}

// blocks reads where the blocks of the first band are. Each must lie in the file and have enough bytes
// for its cells, so that a small file cannot ask for much memory.
func (d *decoder) blocks() (err error) {
	n := d.across * d.down
	offsetTag, countTag := uint16(tagStripOffsets), uint16(tagStripCounts)
	if d.tiled {
		offsetTag, countTag = tagTileOffsets, tagTileCounts
	}
	if d.offsets, err = d.numbers(d.img, offsetTag, uint64(n)); err != nil {
		return err
	}
	if d.counts, err = d.numbers(d.img, countTag, uint64(n)); err != nil {
		return err
	}
	if d.offsets.len() < n || d.counts.len() < n {
		return fault("bad_header", fmt.Sprintf("tag %d", offsetTag), fmt.Sprintf("the grid has %d blocks, but the header places %d", n, min(d.offsets.len(), d.counts.len())), doCopy)
	}
	most := uint64(1)
	switch d.compression {
	case compressionLZW:
		most = lzwMost
	case compressionDeflate, compressionOldDeflate:
		most = deflateMost
	}
	all := uint64(0)
	for i := range n {
		at, count := d.offsets.at(i), d.counts.at(i)
		if at == 0 || count == 0 {
			d.sparse++
			continue
		}
		if at > d.size || count > d.size-at {
			return fault("truncated", d.blockName(i), fmt.Sprintf("it has %d bytes from byte %d on, but the file ends at %d", count, at, d.size), doCopy)
		}
		if need := uint64(d.blockRows(i/d.across)) * uint64(d.rowBytes); count < need && count < (need-1)/most+1 {
			return fault("damaged", d.blockName(i), fmt.Sprintf("it has %d bytes, too few for its cells", count), doCopy)
		}
		if all += count; all > maxShared*d.size {
			return fault("damaged", d.blockName(i), "too many blocks share their bytes with others", doDeflate)
		}
	}
	if d.sparse == n {
		return fault("no_values", "", "the file holds no values: all blocks are left out", "choose another file")
	}
	return nil
}

// read fills the grid.
func (d *decoder) read(g *raster.Grid) error {
	g.Values = make([]float32, d.Cols*d.Rows)
	d.row = make([]byte, d.rowBytes)
	if d.predictor == 3 {
		d.other = make([]byte, d.rowBytes)
	}
	d.cells = make([]float64, min(d.blockW, d.Cols))
	d.src = source{ctx: d.ctx, r: d.r, progress: d.o.Progress}
	d.in = bufio.NewReaderSize(&d.src, 64<<10)
	if d.o.Metres && d.VerticalToM > 0 {
		d.Scale *= d.VerticalToM
		d.Offset *= d.VerticalToM
	}
	for by := range d.down {
		for bx := range d.across {
			if err := d.block(g, bx, by); err != nil {
				return err
			}
		}
	}
	return nil
}

func (d *decoder) block(g *raster.Grid, bx, by int) error {
	i := by*d.across + bx
	left, top := bx*d.blockW, by*d.blockH
	cols, rows := min(d.blockW, d.Cols-left), min(d.blockH, d.Rows-top)
	part := func(r int) []float32 {
		row := top + r
		if d.southUp() {
			row = d.Rows - 1 - row
		}
		return g.Values[row*d.Cols+left:][:cols]
	}
	at, count := d.offsets.at(i), d.counts.at(i)
	if at == 0 || count == 0 {
		for r := range rows {
			dst := part(r)
			for c := range dst {
				dst[c] = float32(math.NaN())
			}
		}
		return d.ctx.Err()
	}
	d.src.at, d.src.end = int64(at), int64(at+count)
	d.in.Reset(&d.src)
	in, err := d.unpacked()
	if err != nil {
		return d.broken(i, err)
	}
	for r := range rows {
		if err := d.ctx.Err(); err != nil { // a few bytes of the file may stand for many rows
			return err
		}
		if _, err := io.ReadFull(in, d.row); err != nil {
			return d.broken(i, err)
		}
		d.undo()
		d.put(part(r))
	}
	if d.z != nil {
		// The sum over the block stands behind its last row.
		rest := int64(d.blockRows(by)-rows) * int64(d.rowBytes)
		if _, err := io.CopyN(io.Discard, in, rest+1); err != nil && !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrUnexpectedEOF) {
			return d.broken(i, err)
		}
	}
	return nil
}

// unpacked gives the block without its compression.
func (d *decoder) unpacked() (io.Reader, error) {
	var err error
	switch d.compression {
	case compressionLZW:
		return lzw.NewReader(d.in, lzw.MSB, 8), nil
	case compressionDeflate, compressionOldDeflate:
		if d.z == nil {
			d.z, err = zlib.NewReader(d.in)
		} else {
			err = d.z.(zlib.Resetter).Reset(d.in, nil)
		}
		return d.z, err
	}
	return d.in, nil
}

func (d *decoder) broken(i int, err error) error {
	if d.src.err != nil {
		err = d.src.err
		var e *formats.Error
		if errors.As(err, &e) {
			e.Where = d.blockName(i)
		}
		return err
	}
	e := fault("damaged", d.blockName(i), "its data end before its last cell", doCopy)
	if !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrUnexpectedEOF) {
		e.What, e.Err = "its data are damaged", err
	}
	return e
}

// A source reads one block of the file.
type source struct {
	ctx      context.Context
	r        io.ReaderAt
	at, end  int64
	done     int64
	told     int64
	progress func(int64)
	err      error // not io.EOF
}

const progressEvery = 1 << 20

func (s *source) Read(p []byte) (int, error) {
	if s.err == nil {
		s.err = s.ctx.Err()
	}
	if s.err != nil {
		return 0, s.err
	}
	if s.at >= s.end {
		return 0, io.EOF
	}
	n, err := s.r.ReadAt(p[:min(int64(len(p)), s.end-s.at)], s.at)
	s.at += int64(n)
	if s.done += int64(n); s.done-s.told >= progressEvery {
		s.told = s.done
		if s.progress != nil {
			s.progress(s.done)
		}
	}
	if n > 0 {
		return n, nil
	}
	if err == nil || errors.Is(err, io.EOF) {
		s.err = fault("truncated", "", "the file became shorter while it was read", doCopy)
	} else {
		e := fault("unreadable", "", "the file cannot be read on", "")
		e.Err = err
		s.err = e
	}
	return 0, s.err
}

// undo takes the predictor away and leaves the numbers of the row least byte first.
func (d *decoder) undo() {
	if d.predictor == 3 {
		// Bytes are stored most significant first whatever the order of the file.
		for i := d.samples; i < len(d.row); i++ {
			d.row[i] += d.row[i-d.samples]
		}
		gather(d.other, d.row, d.width)
		d.row, d.other = d.other, d.row
		return
	}
	if d.order == binary.BigEndian {
		reverse(d.row, d.width)
	}
	if d.predictor == 2 {
		accumulate(d.row, d.width, d.samples*d.width)
	}
}

// reverse turns the bytes of each number round.
func reverse(row []byte, width int) {
	switch width {
	case 2:
		for ; len(row) >= 2; row = row[2:] {
			row[0], row[1] = row[1], row[0]
		}
	case 4:
		for ; len(row) >= 4; row = row[4:] {
			binary.LittleEndian.PutUint32(row, binary.BigEndian.Uint32(row))
		}
	case 8:
		for ; len(row) >= 8; row = row[8:] {
			binary.LittleEndian.PutUint64(row, binary.BigEndian.Uint64(row))
		}
	}
}

// accumulate adds to each number the one that stands back bytes before it, modulo its width.
func accumulate(row []byte, width, back int) {
	le := binary.LittleEndian
	switch width {
	case 1:
		for i := back; i < len(row); i++ {
			row[i] += row[i-back]
		}
	case 2:
		for i := back; i+2 <= len(row); i += 2 {
			le.PutUint16(row[i:], le.Uint16(row[i:])+le.Uint16(row[i-back:]))
		}
	case 4:
		for i := back; i+4 <= len(row); i += 4 {
			le.PutUint32(row[i:], le.Uint32(row[i:])+le.Uint32(row[i-back:]))
		}
	case 8:
		for i := back; i+8 <= len(row); i += 8 {
			le.PutUint64(row[i:], le.Uint64(row[i:])+le.Uint64(row[i-back:]))
		}
	}
}

// gather puts numbers together whose bytes lie in planes, the most significant first.
func gather(dst, src []byte, width int) {
	n := len(src) / width
	for b := range width {
		plane := src[b*n:][:n]
		k := width - 1 - b
		for _, v := range plane {
			dst[k] = v
			k += width
		}
	}
}

// numbersOf reads the first band of a row, exactly.
func (d *decoder) numbersOf(cells []float64) {
	le, step, row := binary.LittleEndian, d.samples*d.width, d.row
	switch {
	case d.sample == floating && d.width == 4:
		for i := range cells {
			cells[i] = float64(math.Float32frombits(le.Uint32(row[i*step:])))
		}
	case d.sample == floating:
		for i := range cells {
			cells[i] = math.Float64frombits(le.Uint64(row[i*step:]))
		}
	case d.width == 1 && d.sample == signed:
		for i := range cells {
			cells[i] = float64(int8(row[i*step]))
		}
	case d.width == 1:
		for i := range cells {
			cells[i] = float64(row[i*step])
		}
	case d.width == 2 && d.sample == signed:
		for i := range cells {
			cells[i] = float64(int16(le.Uint16(row[i*step:])))
		}
	case d.width == 2:
		for i := range cells {
			cells[i] = float64(le.Uint16(row[i*step:]))
		}
	case d.sample == signed:
		for i := range cells {
			cells[i] = float64(int32(le.Uint32(row[i*step:])))
		}
	default:
		for i := range cells {
			cells[i] = float64(le.Uint32(row[i*step:]))
		}
	}
}

// put writes the first band of a row into the grid, NaN where it is missing. The number that means
// missing is looked for before anything is rounded or scaled.
func (d *decoder) put(dst []float32) {
	cells := d.cells[:len(dst)]
	d.numbersOf(cells)
	missing := math.NaN()
	if d.HasNoData {
		missing = d.NoData
	}
	scaled := d.Scale != 1 || d.Offset != 0
	whole := d.sample != floating && d.width == 4 && !scaled // shorter ones are exact
	for i, v := range cells {
		if v == missing {
			dst[i] = float32(math.NaN())
			continue
		}
		if scaled {
			v = v*d.Scale + d.Offset
		}
		f := float32(v)
		if math.Abs(float64(f)) > math.MaxFloat32 {
			d.infinite++
			f = float32(math.NaN())
		}
		if whole && float64(f) != v {
			d.lost++
		}
		dst[i] = f
	}
}
