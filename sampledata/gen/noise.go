package gen

import (
	"hash/fnv"
	"math"
	"math/rand/v2"

	"groundtally/geo"
)

// stream gives the random stream of one step: seeded by the district's seed and the step's name.
func stream(seed uint64, step string) *rand.Rand {
	h := fnv.New64a()
	h.Write([]byte(step))
	return rand.New(rand.NewPCG(seed, h.Sum64()))
}

// chance gives a number from 0 up to 1 that depends on the keys alone.
func chance(keys ...uint64) float64 {
	h := uint64(0)
	for _, k := range keys {
		h = (h ^ k) * 0x9e3779b97f4a7c15
		h ^= h >> 31
		h *= 0xbf58476d1ce4e5b9
		h ^= h >> 29
	}
	h *= 0x94d049bb133111eb
	h ^= h >> 32
	return float64(h>>11) / (1 << 53)
}

// noise is smooth gradient noise over the plane, in about -1 to 1.
type noise struct{ seed uint64 }

func newNoise(seed uint64, step string) noise { return noise{stream(seed, "noise "+step).Uint64()} }

// gradient gives the pseudo-random unit vector at a lattice point.
func (n noise) gradient(i, j int64) (float64, float64) {
	a := float64(chance(n.seed, uint64(i), uint64(j)) * 2 * math.Pi)
	return math.Cos(a), math.Sin(a)
}

// at gives the noise at p for features of the given size in metres.
func (n noise) at(p geo.XY, sizeM float64) float64 {
	x, y := p.X/sizeM, p.Y/sizeM
	i, j := math.Floor(x), math.Floor(y)
	u, v := x-i, y-j
	dot := func(di, dj float64) float64 {
		gx, gy := n.gradient(int64(i+di), int64(j+dj))
		return float64(gx*(u-di)) + float64(gy*(v-dj))
	}
	fu, fv := fade(u), fade(v)
	return float64(1.5 * lerp(lerp(dot(0, 0), dot(1, 0), fu), lerp(dot(0, 1), dot(1, 1), fu), fv))
}

// fractal sums octaves of noise, each half as large and half as strong as the one before.
func (n noise) fractal(p geo.XY, sizeM float64, octaves int) float64 {
	sum, amp := 0.0, 1.0
	for o := range octaves {
		q := geo.XY{X: p.X + float64(977.7*float64(o)), Y: p.Y - float64(613.3*float64(o))}
		sum += float64(amp * n.at(q, sizeM))
		sizeM, amp = sizeM/2, amp/2
	}
	return sum
}

func fade(t float64) float64 {
	return t * t * t * (float64(t*(float64(t*6)-15)) + 10)
}

func lerp(a, b, t float64) float64 { return a + float64((b-a)*t) }

// step01 rises smoothly from 0 at a to 1 at b; with a above b it falls.
func step01(a, b, x float64) float64 {
	t := clamp((x-a)/(b-a), 0, 1)
	return float64(t * t * (3 - float64(2*t)))
}

func clamp(v, lo, hi float64) float64 { return math.Min(hi, math.Max(lo, v)) }

// between draws evenly from lo to hi.
func between(r *rand.Rand, lo, hi float64) float64 { return lo + float64((hi-lo)*r.Float64()) }
