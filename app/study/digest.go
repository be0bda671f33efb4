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
	d := newDigester()
	d.text("layer 1")
	d.count(len(l.Columns))
	for _, c := range l.Columns {
		d.text(c.Name)
		d.text(c.Unit)
		d.flag(c.Personal)
	}
	d.count(len(l.Features))
	for _, f := range l.Features {
		d.text(f.ID)
		d.geometry(f.Geometry)
		for _, v := range f.Values {
			d.count(int(v.Kind))
			switch v.Kind {
			case geo.Text:
				d.text(v.Text)
			case geo.Number:
				d.number(v.Number)
			case geo.Bool:
				d.flag(v.Bool)
			}
		}
	}
	return d.sum()
}

// BlobDigest gives the SHA-256 of a file kept whole.
func BlobDigest(media string, data []byte) string {
	d := newDigester()
	d.text("blob 1")
	d.text(media)
	d.text(string(data))
	return d.sum()
}

// digester gathers what is digested, so that the hash takes it in large pieces. It serves until its sum is
// taken.
type digester struct {
	h   hash.Hash
	buf [2048]byte
	n   int
}

// digesters are kept for the next: every shape of a layer is digested by itself.
var digesters = sync.Pool{New: func() any { return &digester{h: sha256.New()} }}

func newDigester() *digester {
	d, _ := digesters.Get().(*digester) // the pool holds nothing else
	d.h.Reset()
	d.n = 0
	return d
}

func (d *digester) count(n int) { d.word(uint64(n)) }

func (d *digester) word(w uint64) {
	if d.n+8 > len(d.buf) {
		d.flush()
	}
	binary.LittleEndian.PutUint64(d.buf[d.n:], w)
	d.n += 8
}

func (d *digester) text(s string) {
	d.count(len(s))
	if d.n+len(s) > len(d.buf) {
		d.flush()
	}
	if len(s) > len(d.buf) {
		_, _ = io.WriteString(d.h, s) // a hash takes everything
		return
	}
	d.n += copy(d.buf[d.n:], s)
}

func (d *digester) flush() {
	d.h.Write(d.buf[:d.n])
	d.n = 0
}

func (d *digester) number(f float64) {
	if f == 0 {
		f = math.Abs(f) // drops the sign of negative zero
	}
	d.word(math.Float64bits(f))
}

func (d *digester) flag(b bool) {
	if b {
		d.count(1)
	} else {
		d.count(0)
	}
}

func (d *digester) geometry(g geo.LonLatGeometry) {
	d.count(int(g.Kind))
	d.count(len(g.Parts))
	for _, part := range g.Parts {
		d.count(len(part))
		for _, ring := range part {
			d.count(len(ring))
			for _, p := range ring {
				d.number(p.Lon)
				d.number(p.Lat)
			}
		}
	}
}

func (d *digester) sum() string {
	sum := d.raw()
	return hex.EncodeToString(sum[:])
}

func (d *digester) raw() (sum [sha256.Size]byte) {
	d.flush()
	d.h.Sum(sum[:0])
	digesters.Put(d)
	return sum
}
