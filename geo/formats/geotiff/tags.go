package geotiff

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"

	"groundtally/geo/formats"
)

// Tags of the files that are read.
const (
	tagSubfile      = 254
	tagOldSubfile   = 255
	tagWidth        = 256
	tagHeight       = 257
	tagBits         = 258
	tagCompression  = 259
	tagPhotometric  = 262
	tagFillOrder    = 266
	tagStripOffsets = 273
	tagSamples      = 277
	tagRowsPerStrip = 278
	tagStripCounts  = 279
	tagPlanar       = 284
	tagPredictor    = 317
	tagTileWidth    = 322
	tagTileHeight   = 323
	tagTileOffsets  = 324
	tagTileCounts   = 325
	tagExtra        = 338
	tagFormat       = 339
	tagPixelScale   = 33550
	tagTiepoint     = 33922
	tagMatrix       = 34264
	tagGeoKeys      = 34735
	tagGeoTexts     = 34737
	tagMetadata     = 42112
	tagNoData       = 42113
)

const (
	maxImages  = 1024
	maxEntries = 4096    // of one image; about 100 tags are defined
	maxText    = 1 << 20 // bytes of a tag's value, save for the tables of blocks
)

// typeBytes gives the length of one value of a type; 0 is an unknown type.
var typeBytes = [...]uint64{1: 1, 2: 1, 3: 2, 4: 4, 5: 8, 6: 1, 7: 1, 8: 2, 9: 4, 10: 8, 11: 4, 12: 8, 13: 4, 16: 8, 17: 8, 18: 8}

const (
	typeASCII  = 2
	typeFloat  = 11
	typeDouble = 12
)

// An entry says where in the file the values of a tag are.
type entry struct {
	typ   uint16
	count uint64
	at    uint64
}

// An image is one directory of the file.
type image map[uint16]entry

type file struct {
	r     io.ReaderAt
	size  uint64
	order binary.ByteOrder
	big   bool // offsets of 8 bytes
	first uint64
	tags  uint64 // bytes of the directories read so far
}

func newFile(r io.ReaderAt, size int64) (*file, error) {
	if size <= 0 {
		return nil, fault("empty_file", "", "the file is empty", doCopy)
	}
	f := &file{r: r, size: uint64(size), order: binary.LittleEndian}
	notTIFF := fault("not_tiff", "", "the file is not a TIFF file", "choose a GeoTIFF")
	if size < 8 {
		return nil, notTIFF
	}
	b, err := f.bytes(0, min(f.size, 16))
	if err != nil {
		return nil, err
	}
	switch string(b[:2]) {
	case "II":
	case "MM":
		f.order = binary.BigEndian
	default:
		return nil, notTIFF
	}
	switch f.order.Uint16(b[2:]) {
	case 42:
		f.first = uint64(f.order.Uint32(b[4:]))
	case 43:
		f.big = true
		if len(b) < 16 {
			return nil, fault("truncated", "", "the file ends in its first line", doCopy)
		}
		if f.order.Uint16(b[4:]) != 8 || f.order.Uint16(b[6:]) != 0 {
			return nil, fault("bad_header", "", fmt.Sprintf("offsets of %d bytes are not known", f.order.Uint16(b[4:])), doCopy)
		}
		f.first = f.order.Uint64(b[8:])
	default:
		return nil, notTIFF
	}
	return f, nil
}

// bytes reads n bytes, which must lie in the file.
func (f *file) bytes(at, n uint64) ([]byte, error) {
	if at > f.size || n > f.size-at {
		return nil, fault("truncated", "", fmt.Sprintf("the header points to byte %d, but the file has %d", at, f.size), doCopy)
	}
	b := make([]byte, n)
	got, err := f.r.ReadAt(b, int64(at))
	if uint64(got) == n {
		return b, nil
	}
	if err == nil || errors.Is(err, io.EOF) {
		return nil, fault("truncated", "", fmt.Sprintf("the file ends at byte %d, before its size of %d", at+uint64(got), f.size), doCopy)
	}
	e := fault("unreadable", "", "the file cannot be read on", "")
	e.Err = err
	return nil, e
}

// images gives the first full image, how many further ones follow it, and whether there is a mask.
// Overviews are passed over.
func (f *file) images() (main image, further int, mask bool, err error) {
	seen := map[uint64]bool{}
	for at := f.first; at != 0; {
		if seen[at] {
			return nil, 0, false, fault("bad_header", "", "the list of images in the file runs in a circle", doCopy)
		}
		if len(seen) == maxImages {
			return nil, 0, false, fault("too_many", "", fmt.Sprintf("the file has more than %d images", maxImages), "save the one with the values alone")
		}
		seen[at] = true
		var img image
		if img, at, err = f.image(at); err != nil {
			return nil, 0, false, err
		}
		kind, err := f.number(img, tagSubfile, 0)
		if err != nil {
			return nil, 0, false, err
		}
		old, err := f.number(img, tagOldSubfile, 1)
		if err != nil {
			return nil, 0, false, err
		}
		switch {
		case kind&4 != 0:
			mask = true
		case kind&1 != 0 || old == 2: // an overview
		case main == nil:
			main = img
		default:
			further++
		}
	}
	if main == nil {
		return nil, 0, false, fault("bad_header", "", "the file holds no image in full size", doCopy)
	}
	return main, further, mask, nil
}

// image reads the directory at an offset; next is 0 behind the last.
func (f *file) image(at uint64) (img image, next uint64, err error) {
	countBytes, entryBytes, offsetBytes := uint64(2), uint64(12), uint64(4)
	if f.big {
		countBytes, entryBytes, offsetBytes = 8, 20, 8
	}
	b, err := f.bytes(at, countBytes)
	if err != nil {
		return nil, 0, err
	}
	n := f.offset(b)
	if n > maxEntries {
		return nil, 0, fault("bad_header", "", fmt.Sprintf("an image has %d tags, at most %d can be read", n, maxEntries), doCopy)
	}
	at += countBytes
	if b, err = f.bytes(at, n*entryBytes+offsetBytes); err != nil {
		return nil, 0, err
	}
	if f.tags += n * entryBytes; f.tags > f.size {
		return nil, 0, fault("bad_header", "", "images of the file share their tags", doCopy)
	}
	img = image{}
	for i := range n {
		e := b[i*entryBytes : (i+1)*entryBytes]
		tag, v := f.order.Uint16(e), entry{typ: f.order.Uint16(e[2:])}
		if _, twice := img[tag]; twice {
			continue
		}
		v.count = f.offset(e[4:])
		if v.size() == 0 || v.count > f.size/v.size() {
			v.at = math.MaxUint64 // only a fault if the tag is asked for
		} else if v.count*v.size() <= offsetBytes {
			v.at = at + i*entryBytes + entryBytes - offsetBytes
		} else {
			v.at = f.offset(e[entryBytes-offsetBytes:])
		}
		img[tag] = v
	}
	return img, f.offset(b[n*entryBytes:]), nil
}

// offset reads a number as long as the offsets of the file, or a short one where b holds no more.
func (f *file) offset(b []byte) uint64 {
	if f.big {
		return f.order.Uint64(b)
	}
	if len(b) < 4 {
		return uint64(f.order.Uint16(b))
	}
	return uint64(f.order.Uint32(b))
}

// size gives the bytes of one value, 0 if the type is not known.
func (e entry) size() uint64 {
	if int(e.typ) >= len(typeBytes) {
		return 0
	}
	return typeBytes[e.typ]
}

// raw reads the first values of a tag, at most most of them; nil without the tag.
func (f *file) raw(img image, tag uint16, most uint64) ([]byte, entry, error) {
	e, ok := img[tag]
	if !ok {
		return nil, e, nil
	}
	where := fmt.Sprintf("tag %d", tag)
	if e.size() == 0 {
		return nil, e, fault("bad_header", where, fmt.Sprintf("its type %d is not known", e.typ), doCopy)
	}
	if e.at == math.MaxUint64 {
		return nil, e, fault("truncated", where, fmt.Sprintf("it promises %d values, more than the file has bytes for", e.count), doCopy)
	}
	e.count = min(e.count, most)
	b, err := f.bytes(e.at, e.count*e.size())
	if err != nil {
		var bad *formats.Error
		if errors.As(err, &bad) {
			bad.Where = where
		}
		return nil, e, err
	}
	return b, e, nil
}

// A table holds the whole numbers of a tag as they stand in the file, so that it takes no more memory
// than the file has bytes.
type table struct {
	raw   []byte
	width int
	order binary.ByteOrder
}

func (t table) len() int {
	if t.width == 0 {
		return 0
	}
	return len(t.raw) / t.width
}

func (t table) at(i int) uint64 {
	b := t.raw[i*t.width:]
	switch t.width {
	case 1:
		return uint64(b[0])
	case 2:
		return uint64(t.order.Uint16(b))
	case 4:
		return uint64(t.order.Uint32(b))
	}
	return t.order.Uint64(b)
}

// numbers reads the first whole numbers of a tag, at most most of them.
func (f *file) numbers(img image, tag uint16, most uint64) (table, error) {
	b, e, err := f.raw(img, tag, most)
	if err != nil || b == nil {
		return table{}, err
	}
	switch e.typ {
	case 1, 3, 4, 13, 16, 18:
		return table{b, int(e.size()), f.order}, nil
	}
	return table{}, fault("bad_header", fmt.Sprintf("tag %d", tag), fmt.Sprintf("its type is %d, not a whole number", e.typ), doCopy)
}

// number reads a tag with one whole number.
func (f *file) number(img image, tag uint16, otherwise uint64) (uint64, error) {
	t, err := f.numbers(img, tag, 1)
	if err != nil || t.len() == 0 {
		return otherwise, err
	}
	return t.at(0), nil
}

// floats reads the numbers of a tag, at most most of them.
func (f *file) floats(img image, tag uint16, most uint64) ([]float64, error) {
	b, e, err := f.raw(img, tag, most)
	if err != nil || b == nil {
		return nil, err
	}
	where := fmt.Sprintf("tag %d", tag)
	out := make([]float64, e.count)
	for i := range out {
		switch e.typ {
		case typeFloat:
			out[i] = float64(math.Float32frombits(f.order.Uint32(b[4*i:])))
		case typeDouble:
			out[i] = math.Float64frombits(f.order.Uint64(b[8*i:]))
		default:
			return nil, fault("bad_header", where, fmt.Sprintf("its type is %d, not a floating-point number", e.typ), doCopy)
		}
		if math.IsNaN(out[i]) || math.IsInf(out[i], 0) {
			return nil, fault("bad_header", where, fmt.Sprintf("it holds %g", out[i]), doCopy)
		}
	}
	return out, nil
}

// text reads a tag with text; a zero byte ends it.
func (f *file) text(img image, tag uint16) (string, error) {
	if e, ok := img[tag]; ok && e.count > maxText {
		return "", fault("bad_header", fmt.Sprintf("tag %d", tag), fmt.Sprintf("its text has %d bytes, at most %d can be read", e.count, maxText), doCopy)
	}
	b, e, err := f.raw(img, tag, maxText)
	if err != nil || b == nil {
		return "", err
	}
	if e.typ != typeASCII {
		return "", fault("bad_header", fmt.Sprintf("tag %d", tag), fmt.Sprintf("its type is %d, not text", e.typ), doCopy)
	}
	for i, c := range b {
		if c == 0 {
			return string(b[:i]), nil
		}
	}
	return string(b), nil
}
