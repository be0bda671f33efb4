package grid

import (
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"groundtally/scoring/units"
)

// jointQuantities are the quantities of the check table.
var jointQuantities = map[string]func(j Joint) float64{
	"sum_mwh":               func(j Joint) float64 { return j.SumMWh },
	"delivered_mwh":         func(j Joint) float64 { return j.DeliveredMWh },
	"curtailed_mwh":         func(j Joint) float64 { return j.CurtailedMWh },
	"curtailed_frac":        func(j Joint) float64 { return j.CurtailedFrac },
	"hours_at_limit":        func(j Joint) float64 { return j.HoursAtLimit },
	"full_frac":             func(j Joint) float64 { return j.FullFrac },
	"peak_kw":               func(j Joint) float64 { return j.PeakKW },
	"sum_of_peaks_kw":       func(j Joint) float64 { return j.SumOfPeaksKW },
	"saved_kw":              func(j Joint) float64 { return j.SavedKW },
	"saved_frac":            func(j Joint) float64 { return j.SavedFrac },
	"cut_a_frac":            func(j Joint) float64 { return j.Parts[0].CutFrac },
	"cut_b_frac":            func(j Joint) float64 { return j.Parts[1].CutFrac },
	"alone_a_full_frac":     func(j Joint) float64 { return j.Parts[0].AloneFullFrac },
	"alone_b_full_frac":     func(j Joint) float64 { return j.Parts[1].AloneFullFrac },
	"alone_b_delivered_mwh": func(j Joint) float64 { return j.Parts[1].AloneDeliveredMWh },
	"correlation":           func(j Joint) float64 { return j.Correlation.Value },
}

func joint(tb testing.TB, parts [][]float64, limitKW, hours float64) Joint {
	tb.Helper()
	j, err := JointExport(parts, limitKW, hours)
	if err != nil {
		tb.Fatal(err)
	}
	return j
}

// windAndSun are made-up series: sun by day, wind that lasts for hours; both stand at their rating at times.
func windAndSun(r *rand.Rand, hours int) [][]float64 {
	wind, sun := make([]float64, hours), make([]float64, hours)
	at := 0.3
	for h := range hours {
		at = math.Abs(0.97*at + 0.08*r.NormFloat64())
		wind[h] = 3000 * min(1, at)
		sun[h] = 2000 * min(0.8, max(0, math.Sin(2*math.Pi*float64(h%24-6)/24))*r.Float64())
	}
	return [][]float64{wind, sun}
}

// inHours is the same hour by hour, straight from the definitions.
func inHours(parts [][]float64, limitKW float64) Joint {
	j := Joint{LimitKW: limitKW, Parts: make([]JointPart, len(parts))}
	known := 0.0
	var whole []int
	for h := range parts[0] {
		if !slices.ContainsFunc(parts, func(p []float64) bool { return math.IsNaN(p[h]) }) {
			whole = append(whole, h)
			known++
		}
	}
	k := units.HoursPerYear / known / units.KWhPerMWh
	for _, h := range whole {
		s := 0.0
		for i := range parts {
			s += parts[i][h]
		}
		j.SumMWh += s * k
		j.DeliveredMWh += min(s, limitKW) * k
		j.CurtailedMWh += max(0, s-limitKW) * k
		j.PeakKW = max(j.PeakKW, s)
		if s >= limitKW {
			j.HoursAtLimit += units.HoursPerYear / known
		}
		for i := range parts {
			x, p := parts[i][h], &j.Parts[i]
			p.EnergyMWh += x * k
			p.PeakKW = max(p.PeakKW, x)
			p.AloneDeliveredMWh += min(x, limitKW) * k
			if s > 0 {
				p.CutMWh += x * max(0, 1-limitKW/s) * k
			}
		}
	}
	return j
}

func near(a, b, scale float64) bool { return math.Abs(a-b) <= 1e-9*max(1, scale) }

func same(t *testing.T, a, b Joint) {
	t.Helper()
	ok := near(a.SumMWh, b.SumMWh, a.SumMWh) && near(a.DeliveredMWh, b.DeliveredMWh, a.SumMWh) && near(a.CurtailedMWh, b.CurtailedMWh, a.SumMWh) &&
		a.PeakKW == b.PeakKW && near(a.HoursAtLimit, b.HoursAtLimit, units.HoursPerYear)
	for i := range a.Parts {
		p, q := a.Parts[i], b.Parts[i]
		ok = ok && near(p.EnergyMWh, q.EnergyMWh, a.SumMWh) && near(p.AloneDeliveredMWh, q.AloneDeliveredMWh, a.SumMWh) && near(p.CutMWh, q.CutMWh, a.SumMWh) && p.PeakKW == q.PeakKW
	}
	if !ok {
		t.Errorf("%+v, not %+v", a, b)
	}
}

func TestJointIsThatOfItsHours(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 22))
	for range 60 {
		parts := windAndSun(r, 500)
		if r.IntN(2) == 0 {
			parts = append(parts, windAndSun(r, 500)[0])
		}
		if r.IntN(3) == 0 {
			parts = parts[:1]
		}
		for range r.IntN(40) {
			parts[r.IntN(len(parts))][r.IntN(500)] = math.NaN()
		}
		limits := []float64{3000, 1600, 3000, 1e-3, 1e9}
		for range 12 {
			limits = append(limits, 9000*r.Float64()+1)
		}
		curve, err := CurtailmentCurve(parts, limits, 1)
		if err != nil {
			t.Fatal(err)
		}
		for o, j := range curve {
			if j.LimitKW != limits[o] {
				t.Fatalf("limit %v stands for %v", j.LimitKW, limits[o])
			}
			same(t, j, inHours(parts, limits[o]))
			same(t, j, joint(t, parts, limits[o], 1))

			full := j.LimitKW * units.HoursPerYear / units.KWhPerMWh
			if j.DeliveredMWh > full*(1+1e-12) || j.FullFrac > 1+1e-12 {
				t.Errorf("%v MWh through %v kW", j.DeliveredMWh, j.LimitKW)
			}
			energy, cut, alone := 0.0, 0.0, 0.0
			for _, p := range j.Parts {
				energy, cut, alone = energy+p.EnergyMWh, cut+p.CutMWh, alone+p.AloneDeliveredMWh
				if p.CutFrac < 0 || p.CutFrac > 1+1e-12 || p.AloneDeliveredMWh > p.EnergyMWh || p.AloneDeliveredMWh < p.EnergyMWh-p.CutMWh-1e-9*energy {
					t.Errorf("limit %v: part %+v", j.LimitKW, p)
				}
			}
			if energy != j.SumMWh || !near(cut, j.CurtailedMWh, energy) || !near(j.DeliveredMWh+j.CurtailedMWh, energy, energy) || alone < j.DeliveredMWh-1e-9*energy {
				t.Errorf("limit %v: parts do not add up: %+v", j.LimitKW, j)
			}
			if j.PeakKW > j.SumOfPeaksKW || j.SavedKW < 0 || j.SavedFrac > 1 {
				t.Errorf("peaks: %+v", j)
			}
			if j.Correlation.Known != (len(parts) == 2) {
				t.Errorf("%d parts, correlation %v", len(parts), j.Correlation)
			}
		}
		// More connection never delivers less.
		slices.SortFunc(curve, func(a, b Joint) int { return int(math.Copysign(1, a.LimitKW-b.LimitKW)) })
		for i := 1; i < len(curve); i++ {
			if curve[i].DeliveredMWh < curve[i-1].DeliveredMWh-1e-9*curve[i].SumMWh || curve[i].HoursAtLimit > curve[i-1].HoursAtLimit {
				t.Errorf("%v kW deliver less than %v", curve[i].LimitKW, curve[i-1].LimitKW)
			}
		}
	}
}

// A limit at or above the greatest sum cuts nothing at all, not even a trace of rounding.
func TestJointLimitAboveAllCutsNothing(t *testing.T) {
	parts := windAndSun(rand.New(rand.NewPCG(1, 2)), 8760)
	peak := joint(t, parts, 1, 1).PeakKW
	for _, limit := range []float64{peak, math.Nextafter(peak, math.Inf(1)), 2 * peak} {
		j := joint(t, parts, limit, 1)
		if j.CurtailedMWh != 0 || j.DeliveredMWh != j.SumMWh || j.Parts[0].CutMWh != 0 || j.Parts[1].CutFrac != 0 {
			t.Errorf("%+v", j)
		}
		if (j.HoursAtLimit > 0) != (limit == peak) {
			t.Errorf("%v hours at %v of %v", j.HoursAtLimit, limit, peak)
		}
	}
	// A part that stands at its limit for hours is whole alone.
	if j := joint(t, parts, 3000, 1); j.Parts[0].AloneDeliveredMWh != j.Parts[0].EnergyMWh {
		t.Errorf("%+v", j.Parts[0])
	}
}

func TestJointOrderDoesNotMatter(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	parts := windAndSun(r, 4000)
	parts[0][7], parts[1][9] = math.NaN(), math.NaN()
	a := joint(t, parts, 2500, 1)
	r.Shuffle(4000, func(i, j int) {
		for _, p := range parts {
			p[i], p[j] = p[j], p[i]
		}
	})
	b := joint(t, parts, 2500, 1)
	same(t, a, b)
	if !near(a.Correlation.Value, b.Correlation.Value, 1) {
		t.Errorf("correlation %v, shuffled %v", a.Correlation, b.Correlation)
	}
	c := joint(t, [][]float64{parts[1], parts[0]}, 2500, 1)
	if !near(b.DeliveredMWh, c.DeliveredMWh, b.SumMWh) || !near(b.Parts[0].CutMWh, c.Parts[1].CutMWh, b.SumMWh) || b.Correlation.Value != c.Correlation.Value {
		t.Errorf("%+v, parts exchanged %+v", b, c)
	}
}

// Hours not known in one part are left out of all; the rest stands for the year, however long an interval is.
func TestJointUnknownHours(t *testing.T) {
	nan := math.NaN()
	parts := [][]float64{{3, nan, 1, 0, 4, 9}, {0, 7, 2, 5, 4, nan}}
	a, b := joint(t, parts, 4, 0.5), joint(t, [][]float64{{3, 1, 0, 4}, {0, 2, 5, 4}}, 4, 1)
	if a.KnownHours != 2 || a.UnknownHours != 1 || a.Parts[0].UnknownHours != 0.5 || a.Parts[1].UnknownHours != 0.5 {
		t.Errorf("%+v", a)
	}
	if a.PeakKW != 8 || a.DeliveredMWh != b.DeliveredMWh || a.HoursAtLimit != b.HoursAtLimit || a.Correlation != b.Correlation {
		t.Errorf("%+v, without them %+v", a, b)
	}
}

func TestJointRefuses(t *testing.T) {
	nan := math.NaN()
	for name, err := range map[string]error{
		"no parts":        second(JointExport(nil, 1, 1)),
		"no hours":        second(JointExport([][]float64{{}}, 1, 1)),
		"lengths":         second(JointExport([][]float64{{1, 2}, {1}}, 1, 1)),
		"negative":        second(JointExport([][]float64{{1, -2}}, 1, 1)),
		"infinite":        second(JointExport([][]float64{{1, math.Inf(1)}}, 1, 1)),
		"nothing known":   second(JointExport([][]float64{{nan, 1}, {1, nan}}, 1, 1)),
		"no energy":       second(JointExport([][]float64{{0, 0}}, 1, 1)),
		"no limit":        second(JointExport([][]float64{{1, 2}}, 0, 1)),
		"unknown limit":   second(JointExport([][]float64{{1, 2}}, nan, 1)),
		"endless limit":   second(JointExport([][]float64{{1, 2}}, math.Inf(1), 1)),
		"no time":         second(JointExport([][]float64{{1, 2}}, 1, 0)),
		"one bad limit":   second(CurtailmentCurve([][]float64{{1, 2}}, []float64{1, -1}, 1)),
		"pair of lengths": second(Correlation([]float64{1, 2}, []float64{1})),
		"infinite pair":   second(Correlation([]float64{1, 2}, []float64{1, math.Inf(-1)})),
	} {
		if !errors.Is(err, ErrInput) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if c, err := CurtailmentCurve([][]float64{{1, 2}}, nil, 1); err != nil || len(c) != 0 {
		t.Errorf("no limits: %v, %v", c, err)
	}
	// A part that never runs is cut by nothing.
	if j := joint(t, [][]float64{{0, 0}, {1, 3}}, 2, 1); j.Parts[0].CutFrac != 0 || j.Parts[0].AloneFullFrac != 0 || j.Correlation.Known {
		t.Errorf("%+v", j)
	}
}

func second[T any](_ T, err error) error { return err }

func TestCorrelation(t *testing.T) {
	a := []float64{1, 2, 3, 5, 8}
	for name, c := range map[string]struct {
		b     []float64
		want  float64
		known bool
	}{
		"itself":     {a, 1, true},
		"opposite":   {[]float64{-1, -2, -3, -5, -8}, -1, true},
		"line":       {[]float64{3.5, 4, 4.5, 5.5, 7}, 1, true},
		"even":       {[]float64{0.1, 0.1, 0.1, 0.1, 0.1}, 0, false},
		"with a gap": {[]float64{2, 4, math.NaN(), 10, 16}, 1, true},
		"one hour":   {[]float64{math.NaN(), math.NaN(), 1, math.NaN(), math.NaN()}, 0, false},
	} {
		got, err := Correlation(a, c.b)
		if err != nil || got.Known != c.known || math.Abs(got.Value-c.want) > 1e-12 {
			t.Errorf("%s: %v, %v", name, got, err)
		}
	}
}

// Memory does not grow with the hours, and the input is left as it is.
func TestJointLeavesItsInput(t *testing.T) {
	parts, limits := windAndSun(rand.New(rand.NewPCG(5, 6)), 9000), []float64{4000, 1000, 2000}
	first := slices.Clone(parts[0])
	allocs := func(hours int) float64 {
		short := [][]float64{parts[0][:hours], parts[1][:hours]}
		return testing.AllocsPerRun(3, func() {
			if _, err := CurtailmentCurve(short, limits, 1); err != nil {
				t.Fatal(err)
			}
		})
	}
	if a, b := allocs(90), allocs(9000); a != b {
		t.Errorf("%v allocations for 90 hours, %v for 9000", a, b)
	}
	if !slices.Equal(limits, []float64{4000, 1000, 2000}) || !slices.Equal(first, parts[0]) {
		t.Error("the input changed")
	}
}

func BenchmarkJointExport(b *testing.B) {
	parts := windAndSun(rand.New(rand.NewPCG(7, 8)), 87600)
	b.ReportAllocs()
	for b.Loop() {
		joint(b, parts, 2500, 1)
	}
}

func BenchmarkCurtailmentCurve(b *testing.B) {
	parts := windAndSun(rand.New(rand.NewPCG(7, 8)), 87600)
	limits := make([]float64, 100)
	for i := range limits {
		limits[i] = 46 * float64(i+1)
	}
	b.ReportAllocs()
	for b.Loop() {
		if _, err := CurtailmentCurve(parts, limits, 1); err != nil {
			b.Fatal(err)
		}
	}
}
