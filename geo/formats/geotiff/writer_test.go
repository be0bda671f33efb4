package geotiff

import (
	"bytes"
	"compress/zlib"
	"encoding/binary"
	"math"
	"testing"
)

// A tagged is one tag of a file made here: whole numbers, floating-point numbers or text.
type tagged struct {
	id     uint16
	typ    uint16
	whole  []uint64
	float  []float64
	text   string
	blocks bool // whole are places of blocks, to be moved behind the header
}

func short16(id uint16, v ...uint64) tagged { return tagged{id: id, typ: 3, whole: v} }
func long32(id uint16, v ...uint64) tagged  { return tagged{id: id, typ: 4, whole: v} }
func long64(id uint16, v ...uint64) tagged  { return tagged{id: id, typ: 16, whole: v} }
func double(id uint16, v ...float64) tagged { return tagged{id: id, typ: 12, float: v} }
func words(id uint16, s string) tagged      { return tagged{id: id, typ: 2, text: s + "\x00"} }

// A maker writes files of our own, for what GDAL does not write.
type maker struct {
	order binary.AppendByteOrder
	big   bool
}

func (m maker) offset(b []byte, v uint64) []byte {
	if m.big {
		return m.order.AppendUint64(b, v)
	}
	return m.order.AppendUint32(b, uint32(v))
}

// file writes images one behind the other, then the bytes of the blocks.
func (m maker) file(blocks []byte, images ...[]tagged) []byte {
	first, entry, slot := 8, 12, 4
	if m.big {
		first, entry, slot = 16, 20, 8
	}
	// Twice: the first time to learn where the blocks begin.
	var out []byte
	for start, round := 0, 0; round < 2; round++ {
		mark := "II"
		if m.order == binary.AppendByteOrder(binary.BigEndian) {
			mark = "MM"
		}
		out = append([]byte(nil), mark...)
		if m.big {
			out = m.order.AppendUint16(out, 43)
			out = m.order.AppendUint16(out, 8)
			out = m.order.AppendUint16(out, 0)
		} else {
			out = m.order.AppendUint16(out, 42)
		}
		out = m.offset(out, uint64(first))
		for i, img := range images {
			at := len(out)
			head := 2 + entry*len(img) + slot
			if m.big {
				head += 6
			}
			var values []byte
			if m.big {
				out = m.order.AppendUint64(out, uint64(len(img)))
			} else {
				out = m.order.AppendUint16(out, uint16(len(img)))
			}
			for _, t := range img {
				var v []byte
				for _, n := range t.whole {
					if t.blocks && n != 0 {
						n += uint64(start) - 1
					}
					switch t.typ {
					case 1:
						v = append(v, byte(n))
					case 3:
						v = m.order.AppendUint16(v, uint16(n))
					case 4:
						v = m.order.AppendUint32(v, uint32(n))
					default:
						v = m.order.AppendUint64(v, n)
					}
				}
				for _, n := range t.float {
					v = m.order.AppendUint64(v, math.Float64bits(n))
				}
				v = append(v, t.text...)
				out = m.order.AppendUint16(out, t.id)
				out = m.order.AppendUint16(out, t.typ)
				out = m.offset(out, uint64(len(t.whole)+len(t.float)+len(t.text)))
				if len(v) <= slot {
					out = append(out, append(v, make([]byte, slot-len(v))...)...)
				} else {
					out = m.offset(out, uint64(at+head+len(values)))
					values = append(values, v...)
				}
			}
			next := 0
			if i+1 < len(images) {
				next = at + head + len(values)
			}
			out = append(m.offset(out, uint64(next)), values...)
		}
		start = len(out)
	}
	return append(out, blocks...)
}

// float32Grid makes a file of tiles with Deflate and predictor 3.
func (m maker) float32Grid(cols, rows, side int, at func(c, r int) float32) []byte {
	var blocks bytes.Buffer
	var offsets, counts []uint64
	row, planes := make([]float32, side), make([]byte, 4*side)
	for top := 0; top < rows; top += side {
		for left := 0; left < cols; left += side {
			start := blocks.Len()
			z, err := zlib.NewWriterLevel(&blocks, zlib.BestSpeed)
			if err != nil {
				panic(err)
			}
			for r := range side {
				for c := range row {
					row[c] = at(min(left+c, cols-1), min(top+r, rows-1))
				}
				for c, v := range row {
					for b := range 4 {
						planes[b*side+c] = byte(math.Float32bits(v) >> (24 - 8*b))
					}
				}
				for i := len(planes) - 1; i > 0; i-- {
					planes[i] -= planes[i-1]
				}
				z.Write(planes)
			}
			z.Close()
			offsets, counts = append(offsets, uint64(start)+1), append(counts, uint64(blocks.Len()-start))
		}
	}
	return m.file(blocks.Bytes(), []tagged{
		long32(tagWidth, uint64(cols)), long32(tagHeight, uint64(rows)), short16(tagBits, 32), short16(tagCompression, compressionDeflate),
		short16(tagPhotometric, 1), short16(tagSamples, 1), short16(tagPredictor, 3), long32(tagTileWidth, uint64(side)), long32(tagTileHeight, uint64(side)),
		{id: tagTileOffsets, typ: 4, whole: offsets, blocks: true}, long32(tagTileCounts, counts...), short16(tagFormat, 3),
		double(tagPixelScale, 25, 25, 0), double(tagTiepoint, 0, 0, 0, 500000, 5316875, 0),
	})
}

// plain gives the tags of a grid in one strip, uncompressed, with further tags put in or over them.
func plain(cols, rows, bits, format uint64, more ...tagged) []tagged {
	tags := []tagged{
		long32(tagWidth, cols), long32(tagHeight, rows), short16(tagBits, bits), short16(tagCompression, compressionNone),
		{id: tagStripOffsets, typ: 16, whole: []uint64{1}, blocks: true}, short16(tagSamples, 1), long32(tagRowsPerStrip, rows),
		long64(tagStripCounts, cols*rows*bits/8), short16(tagFormat, format),
		double(tagPixelScale, 25, 25, 0), double(tagTiepoint, 0, 0, 0, 500000, 5316875, 0),
	}
next:
	for _, t := range more {
		for i := range tags {
			if tags[i].id == t.id {
				tags[i] = t
				continue next
			}
		}
		tags = append(tags, t)
	}
	return tags
}

func floats(order binary.AppendByteOrder, v ...float32) (b []byte) {
	for _, f := range v {
		b = order.AppendUint32(b, math.Float32bits(f))
	}
	return b
}

func doubles(order binary.AppendByteOrder, v ...float64) (b []byte) {
	for _, f := range v {
		b = order.AppendUint64(b, math.Float64bits(f))
	}
	return b
}

func int32s(order binary.AppendByteOrder, v ...int32) (b []byte) {
	for _, n := range v {
		b = order.AppendUint32(b, uint32(n))
	}
	return b
}

var (
	little = maker{order: binary.LittleEndian}
	large  = maker{order: binary.BigEndian, big: true}
)

// Files of both orders and both sizes with predictor 3, the one thing that GDAL does not write rightly.
func TestPredictor3(t *testing.T) {
	at := func(c, r int) float32 { return float32(c)*0.3 - float32(r)*1.7 }
	for _, m := range []maker{little, large, {order: binary.BigEndian}, {order: binary.LittleEndian, big: true}} {
		got, err := decodeBytes(m.float32Grid(41, 29, 16, at), Options{})
		if err != nil {
			t.Fatal(err)
		}
		for r := range 29 {
			for c := range 41 {
				if v, ok := got.Grid.At(c, r); !ok || v != at(c, r) {
					t.Fatalf("%v: column %d, row %d: %g, %t, want %g", m, c, r, v, ok, at(c, r))
				}
			}
		}
	}
}

func BenchmarkDecode(b *testing.B) {
	const side = 2000
	in := little.float32Grid(side, side, 256, func(c, r int) float32 {
		return 400 + 200*float32(math.Sin(float64(c)/97)*math.Cos(float64(r)/71)) + float32((c*7919+r*104729)%64)/64
	})
	b.SetBytes(4 * side * side)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := decodeBytes(in, Options{}); err != nil {
			b.Fatal(err)
		}
	}
}
