package run

import (
	"groundtally/app/study"
	"groundtally/geo"
)

// keyer builds the digest of everything a step reads, as study.Digester writes it. It serves until its sum is taken.
type keyer struct{ d *study.Digester }

// newKey begins a digest with the step's name and edition.
func newKey(step string, edition int) *keyer {
	k := &keyer{study.NewDigester()}
	k.text(step)
	k.int(edition)
	return k
}

func (k *keyer) int(n int)      { k.d.Int(n) }
func (k *keyer) text(s string)  { k.d.Text(s) }
func (k *keyer) num(f float64)  { k.d.Number(f) }
func (k *keyer) bytes(b []byte) { k.d.Bytes(b) }

func (k *keyer) geometry(g geo.XYGeometry) {
	study.DigestGeometry(k.d, g, func(p geo.XY) (float64, float64) { return p.X, p.Y })
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

func (k *keyer) sum() string { return k.d.Sum() }
