package run

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"hash"
	"math"

	"groundtally/geo"
)

// keyer builds the digest of everything a step reads. Texts are written with their length before
// them and numbers as their bits, so that no two inputs can run together.
type keyer struct {
	h   hash.Hash
	buf [8]byte
}

// newKey begins a digest with the step's name and edition.
func newKey(step string, edition int) *keyer {
	k := &keyer{h: sha256.New()}
	k.text(step)
	k.int(edition)
	return k
}

func (k *keyer) int(n int) {
	binary.LittleEndian.PutUint64(k.buf[:], uint64(n))
	k.h.Write(k.buf[:])
}

func (k *keyer) text(s string) {
	k.int(len(s))
	k.h.Write([]byte(s))
}

func (k *keyer) num(f float64) {
	if f == 0 {
		f = math.Abs(f)
	}
	binary.LittleEndian.PutUint64(k.buf[:], math.Float64bits(f))
	k.h.Write(k.buf[:])
}

func (k *keyer) geometry(g geo.XYGeometry) {
	k.int(int(g.Kind))
	k.int(len(g.Parts))
	for _, part := range g.Parts {
		k.int(len(part))
		for _, ring := range part {
			k.int(len(ring))
			for _, p := range ring {
				k.num(p.X)
				k.num(p.Y)
			}
		}
	}
}

// of writes numbers and ends the digest.
func (k *keyer) of(xs ...float64) string {
	for _, x := range xs {
		k.num(x)
	}
	return k.sum()
}

func (k *keyer) texts(list []string) {
	k.int(len(list))
	for _, s := range list {
		k.text(s)
	}
}

func (k *keyer) sum() string { return hex.EncodeToString(k.h.Sum(nil)) }
