package study

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"hash"
	"io"
	"math"
	"sync"

	"groundtally/geo"
)

// LayerDigest gives the SHA-256 of a layer's content: columns (name, unit, personal), then features
// (identifier, geometry, values) in order. Every text is preceded by its length as a 64-bit
// little-endian integer; every number is its IEEE 754 bits, little-endian, with negative zero written
// as zero. The layer's name is not part of it.
func LayerDigest(l *geo.Layer) string {
	d := NewDigester()
	d.Text("layer 1")
	d.Int(len(l.Columns))
	for _, c := range l.Columns {
		d.Text(c.Name)
		d.Text(c.Unit)
		d.Bool(c.Personal)
	}
	d.Int(len(l.Features))
	for _, f := range l.Features {
		d.Text(f.ID)
		d.lonLats(f.Geometry)
		for _, v := range f.Values {
			d.Int(int(v.Kind))
			switch v.Kind {
			case geo.Text:
				d.Text(v.Text)
			case geo.Number:
				d.Number(v.Number)
			case geo.Bool:
				d.Bool(v.Bool)
			}
		}
	}
	return d.Sum()
}

// BlobDigest gives the SHA-256 of a file kept whole.
func BlobDigest(media string, data []byte) string {
	d := NewDigester()
	d.Text("blob 1")
	d.Text(media)
	d.Int(len(data))
	d.Bytes(data)
	return d.Sum()
}

// Digester makes a SHA-256 of texts, numbers and geometries: whole numbers as 64 bits little-endian, texts behind
// their length, numbers as their IEEE 754 bits with negative zero written as zero, so that no two contents run
// together. It gathers what is digested, so that the hash takes it in large pieces, and serves until its sum is taken.
type Digester struct {
	h   hash.Hash
	buf [2048]byte
	n   int
}

// digesters are kept for the next: every shape of a layer is digested by itself.
var digesters = sync.Pool{New: func() any { return &Digester{h: sha256.New()} }}

// NewDigester begins a digest.
func NewDigester() *Digester {
	d, _ := digesters.Get().(*Digester) // the pool holds nothing else
	d.h.Reset()
	d.n = 0
	return d
}

// Int digests a whole number.
func (d *Digester) Int(n int) { d.word(uint64(n)) }

func (d *Digester) word(w uint64) {
	if d.n+8 > len(d.buf) {
		d.flush()
	}
	binary.LittleEndian.PutUint64(d.buf[d.n:], w)
	d.n += 8
}

// Text digests a text behind its length.
func (d *Digester) Text(s string) {
	d.Int(len(s))
	if d.n+len(s) > len(d.buf) {
		d.flush()
	}
	if len(s) > len(d.buf) {
		_, _ = io.WriteString(d.h, s) // a hash takes everything
		return
	}
	d.n += copy(d.buf[d.n:], s)
}

// Bytes digests bytes of a known length, as digests, without it.
func (d *Digester) Bytes(b []byte) {
	d.flush()
	d.h.Write(b)
}

func (d *Digester) flush() {
	d.h.Write(d.buf[:d.n])
	d.n = 0
}

// Number digests a number.
func (d *Digester) Number(f float64) {
	if f == 0 {
		f = math.Abs(f) // drops the sign of negative zero
	}
	d.word(math.Float64bits(f))
}

// Bool digests a yes or no.
func (d *Digester) Bool(b bool) {
	if b {
		d.Int(1)
	} else {
		d.Int(0)
	}
}

// DigestGeometry digests a geometry; xy gives the two numbers of a position.
func DigestGeometry[P geo.LonLat | geo.XY](d *Digester, g geo.Geometry[P], xy func(P) (float64, float64)) {
	d.Int(int(g.Kind))
	d.Int(len(g.Parts))
	for _, part := range g.Parts {
		d.Int(len(part))
		for _, ring := range part {
			d.Int(len(ring))
			for _, p := range ring {
				x, y := xy(p)
				d.Number(x)
				d.Number(y)
			}
		}
	}
}

func (d *Digester) lonLats(g geo.LonLatGeometry) {
	DigestGeometry(d, g, func(p geo.LonLat) (float64, float64) { return p.Lon, p.Lat })
}

// Sum ends the digest and gives it in hexadecimal.
func (d *Digester) Sum() string {
	sum := d.Raw()
	return hex.EncodeToString(sum[:])
}

// Raw ends the digest and gives its bytes.
func (d *Digester) Raw() (sum [sha256.Size]byte) {
	d.flush()
	d.h.Sum(sum[:0])
	digesters.Put(d)
	return sum
}
