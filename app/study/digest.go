package study

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"hash"
	"math"

	"groundtally/geo"
)

// LayerDigest gives the SHA-256 of a layer's content: columns (name, unit, personal), then features
// (identifier, geometry, values) in order. Every text is preceded by its length as a 64-bit
// little-endian integer; every number is its IEEE 754 bits, little-endian, with negative zero written
// as zero. The layer's name is not part of it.
func LayerDigest(l *geo.Layer) string {
	d := digester{h: sha256.New()}
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
		d.count(int(f.Geometry.Kind))
		d.count(len(f.Geometry.Parts))
		for _, part := range f.Geometry.Parts {
			d.count(len(part))
			for _, ring := range part {
				d.count(len(ring))
				for _, p := range ring {
					d.number(p.Lon)
					d.number(p.Lat)
				}
			}
		}
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
	d := digester{h: sha256.New()}
	d.text("blob 1")
	d.text(media)
	d.text(string(data))
	return d.sum()
}

type digester struct {
	h   hash.Hash
	buf [8]byte
}

func (d *digester) count(n int) {
	binary.LittleEndian.PutUint64(d.buf[:], uint64(n))
	d.h.Write(d.buf[:])
}

func (d *digester) text(s string) {
	d.count(len(s))
	d.h.Write([]byte(s))
}

func (d *digester) number(f float64) {
	if f == 0 {
		f = math.Abs(f) // drops the sign of negative zero
	}
	binary.LittleEndian.PutUint64(d.buf[:], math.Float64bits(f))
	d.h.Write(d.buf[:])
}

func (d *digester) flag(b bool) {
	if b {
		d.count(1)
	} else {
		d.count(0)
	}
}

func (d *digester) sum() string { return hex.EncodeToString(d.h.Sum(nil)) }
