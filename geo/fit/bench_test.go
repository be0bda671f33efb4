package fit

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// wakes is a judge as costly as a real one: in 12 directions every machine loses what Gaussian wakes of all
// others, added as squares, take. It remembers the layout it was asked about last.
type wakes struct {
	rotorM float64
	shares [12]float64 // of the directions, from north clockwise
	at     []geo.XY
	last   float64

	totals, adds, moves int // calls
}

func newWakes(rotorM float64) *wakes {
	w := &wakes{rotorM: rotorM}
	sum := 0.0
	for d := range w.shares {
		w.shares[d] = 1 + math.Cos(float64(d-8)*math.Pi/6)/2 // most from 240 degrees
		sum += w.shares[d]
	}
	for d := range w.shares {
		w.shares[d] /= sum
	}
	return w
}

func (w *wakes) energy(at []geo.XY) float64 {
	sum := 0.0
	for d, share := range w.shares {
		sin, cos := math.Sincos(float64(d) * math.Pi / 6)
		for _, p := range at {
			squares := 0.0
			for _, q := range at {
				v := q.Sub(p)
				down := float64(v.X*sin) + float64(v.Y*cos) // q stands this far upwind
				if down <= 0 {
					continue
				}
				width := 0.25*w.rotorM + 0.035*down
				off := (float64(v.X*cos) - float64(v.Y*sin)) / width
				if math.Abs(off) > 4 {
					continue
				}
				lost := 0.5 * w.rotorM * w.rotorM / (16 * width * width) * math.Exp(-off*off/2)
				squares += float64(lost * lost)
			}
			left := 1 - math.Sqrt(squares)
			sum += float64(share * left * left * left)
		}
	}
	return 1e4 * sum
}

func (w *wakes) now(at []geo.XY) float64 {
	if w.at == nil || !slices.Equal(at, w.at) {
		w.at, w.last = append(w.at[:0], at...), w.energy(at)
	}
	return w.last
}

func (w *wakes) Total(at []geo.XY) float64 {
	w.totals++
	return w.now(at)
}

func (w *wakes) Add(at []geo.XY, p geo.XY) float64 {
	w.adds++
	return w.energy(append(slices.Clone(at), p)) - w.now(at)
}

func (w *wakes) Move(at []geo.XY, i int, p geo.XY) float64 {
	w.moves++
	b := slices.Clone(at)
	b[i] = p
	return w.energy(b) - w.now(at)
}

// hectares gives an irregular polygon of the area.
func hectares(r *rand.Rand, ha float64, corners int) geo.XYGeometry {
	g := area(star(r, 1000, corners))
	k := math.Sqrt(ha * 1e4 / measure.AreaM2(g))
	return geo.Map(g, func(p geo.XY) geo.XY { return geo.XY{X: k * p.X, Y: k * p.Y} })
}

func BenchmarkMachines100ha(b *testing.B) {
	for _, rotorM := range []float64{130, 60} {
		for _, most := range []int{0, 3} {
			for _, corners := range []int{12, 200} {
				b.Run(fmt.Sprintf("rotor_%v_max_%d_corners_%d", rotorM, most, corners), func(b *testing.B) {
					in := Input{Buildable: hectares(rand.New(rand.NewPCG(100, 1)), 100, corners), Spacing: Spacing{AlongM: 5 * rotorM, AcrossM: 3 * rotorM, AzimuthDeg: 240}, Max: most}
					var out Result
					var w *wakes
					for b.Loop() {
						w = newWakes(rotorM)
						in.Gain = w
						var err error
						if out, err = Machines(in); err != nil {
							b.Fatal(err)
						}
					}
					b.ReportMetric(float64(len(out.At)), "machines")
					b.ReportMetric(float64(w.totals), "totals")
					b.ReportMetric(float64(w.adds), "adds")
					b.ReportMetric(float64(w.moves), "moves")
				})
			}
		}
	}
}
