package grid

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"groundtally/scoring/bounds"
	"groundtally/scoring/units"
)

// JointPart is one part of several behind one connection. Energies are of the typical year.
type JointPart struct {
	EnergyMWh float64
	PeakKW    float64 // greatest power in the known hours
	// AloneDeliveredMWh and AloneFullFrac are those of the connection if this part had it for itself.
	AloneDeliveredMWh float64
	AloneFullFrac     float64
	// CutMWh is what the part loses when all parts are cut in proportion to their power of the hour; CutFrac its
	// share of EnergyMWh, 0 for a part without energy.
	CutMWh       float64
	CutFrac      float64
	UnknownHours float64 // of the series
}

// Joint is what several parts deliver through one connection. Energies and HoursAtLimit are of the typical year of
// 8,760 h.
type Joint struct {
	LimitKW float64
	Parts   []JointPart // in the order of the input

	SumMWh        float64 // of the parts, before the limit
	DeliveredMWh  float64
	CurtailedMWh  float64
	CurtailedFrac float64 // of SumMWh
	HoursAtLimit  float64 // in which the sum reaches or exceeds the limit
	FullFrac      float64 // DeliveredMWh over that of the limit all year

	PeakKW       float64 // greatest sum: the connection that the parts need together
	SumOfPeaksKW float64 // the connections that they need one by one
	SavedKW      float64 // SumOfPeaksKW less PeakKW
	SavedFrac    float64 // of SumOfPeaksKW

	// Correlation is that of the power of two parts, see Correlation; not known with another number of parts.
	Correlation Number

	KnownHours, UnknownHours float64 // of the series
}

// JointExport gives what several parts, say wind and sun, deliver through one connection.
//
//	delivered  Σ_h min(s_h, L),  s_h = Σ_i p_ih
//	cut of i   Σ_h p_ih·max(0, 1 − L/s_h)
//	alone      Σ_h min(p_ih, L)
//	full       delivered/(L·8760 h)
//
// partsKW has one series for each part, all of one length, value by value of the same interval of hoursPerValue
// hours: mean power, 0 or more, at the connection, before any limit there. Not a number is not known; an interval
// that is not known in one part is left out of all and counted. The rest stands for the typical year: sums are
// multiplied by 8760 h over the known hours. That is fair only where unknown hours have no season or hour of day
// of their own. limitKW is above 0.
//
// Means hide peaks within the interval, so that the cut and the greatest sum come out too low. Greatest powers are
// those of the hours known in all parts; ratings and other years may exceed them.
//
// Errors wrap ErrInput: no parts, no hours or no energy, lengths that differ, a power that is negative or infinite.
// Source: identities.
func JointExport(partsKW [][]float64, limitKW, hoursPerValue float64) (Joint, error) {
	js, err := CurtailmentCurve(partsKW, []float64{limitKW}, hoursPerValue)
	if err != nil {
		return Joint{}, err
	}
	return js[0], nil
}

// jointBin holds the sums of the hours that reach one limit and not the next; later those of all that reach it, and
// below those of all that do not. What is delivered is not taken as the rest of what is cut: of a small limit little
// but rounding would be left.
type jointBin struct {
	kw    float64
	hours int
	below float64
}

// partBin is the same for a part: power and share of the sum, binned by the sum; power and number of hours,
// binned by the part's own power.
type partBin struct {
	kw, share  float64
	alone      float64
	aloneHours int
	aloneBelow float64
}

// CurtailmentCurve is JointExport for many limits, in the order in which they are given. It goes over the hours
// twice, whatever their number: the limits are sorted, not the hours.
func CurtailmentCurve(partsKW [][]float64, limitsKW []float64, hoursPerValue float64) ([]Joint, error) {
	k, m := len(partsKW), len(limitsKW)
	if k == 0 {
		return nil, bounds.Error("number of parts", 0, "1 or more")
	}
	n := len(partsKW[0])
	err := bounds.Positive("hours of a value", hoursPerValue)
	for _, p := range partsKW {
		if len(p) != n {
			err = errors.Join(err, bounds.Error("number of values", float64(len(p)), "the same in all parts"))
		}
	}
	for _, l := range limitsKW {
		err = errors.Join(err, bounds.Positive("limit", l))
	}
	if err != nil {
		return nil, err
	}

	sorted := slices.Clone(limitsKW)
	slices.Sort(sorted)
	least := math.Inf(1)
	if m > 0 {
		least = sorted[0]
	}
	bins := make([]jointBin, m+1)
	partBins := make([]partBin, k*(m+1)) // those of a bin together
	sums := make([]JointPart, k)         // kW, brought to MWh at the end
	known, peak := 0, 0.0
	for h := range n {
		whole := true
		for i, p := range partsKW {
			switch x := p[h]; {
			case math.IsNaN(x):
				sums[i].UnknownHours += hoursPerValue
				whole = false
			case !(x >= 0) || x > math.MaxFloat64:
				return nil, fmt.Errorf("value %d of part %d: %w", h, i, bounds.NonNegative("power", x))
			}
		}
		if !whole {
			continue
		}
		known++
		sum := 0.0
		for i, p := range partsKW {
			x := p[h]
			sum += x
			sums[i].EnergyMWh += x
			sums[i].PeakKW = max(sums[i].PeakKW, x)
			at := 0
			if x >= least {
				at = reached(sorted, x)
			}
			b := &partBins[at*k+i]
			b.alone += x
			b.aloneHours++
		}
		peak = max(peak, sum)
		if sum < least {
			bins[0].kw += sum
			continue
		}
		at := reached(sorted, sum)
		bins[at].kw += sum
		bins[at].hours++
		for i, p := range partsKW {
			b := &partBins[at*k+i]
			b.kw += p[h]
			b.share += p[h] / sum
		}
	}
	if known == 0 {
		return nil, bounds.Error("hours known in all parts", 0, "above 0")
	}
	for j := 1; j <= m; j++ {
		bins[j].below = bins[j-1].below + bins[j-1].kw
		for i := range k {
			last := &partBins[(j-1)*k+i]
			partBins[j*k+i].aloneBelow = last.aloneBelow + last.alone
		}
	}
	for j := m - 1; j > 0; j-- {
		bins[j].kw += bins[j+1].kw
		bins[j].hours += bins[j+1].hours
		for i := range k {
			b, next := &partBins[j*k+i], &partBins[(j+1)*k+i]
			b.kw += next.kw
			b.share += next.share
			b.alone += next.alone
			b.aloneHours += next.aloneHours
		}
	}

	perYear := units.HoursPerYear / float64(known)
	mwh := perYear / units.KWhPerMWh
	all := Joint{PeakKW: peak, KnownHours: float64(known) * hoursPerValue, UnknownHours: float64(n-known) * hoursPerValue}
	for i := range sums {
		sums[i].EnergyMWh *= mwh
		all.SumMWh += sums[i].EnergyMWh
		all.SumOfPeaksKW += sums[i].PeakKW
	}
	if all.SumMWh == 0 {
		return nil, bounds.Error("energy", 0, "above 0")
	}
	all.SavedKW = max(0, all.SumOfPeaksKW-all.PeakKW)
	all.SavedFrac = all.SavedKW / all.SumOfPeaksKW
	if k == 2 {
		if all.Correlation, err = Correlation(partsKW[0], partsKW[1]); err != nil {
			return nil, err
		}
	}

	out := make([]Joint, m)
	parts := make([]JointPart, m*k)
	for o, limit := range limitsKW {
		j := &out[o]
		*j = all
		j.LimitKW = limit
		j.Parts = parts[o*k : (o+1)*k : (o+1)*k]
		copy(j.Parts, sums)
		at := reached(sorted, limit)
		full := limit * units.HoursPerYear / units.KWhPerMWh
		b := bins[at]
		j.HoursAtLimit = float64(float64(b.hours) * perYear)
		j.DeliveredMWh = j.SumMWh
		// Of hours that just reach the limit rounding would leave a trace.
		if peak > limit {
			through := float64(limit * float64(b.hours))
			j.CurtailedMWh = float64(max(0, b.kw-through) * mwh)
			j.DeliveredMWh = min(j.SumMWh, float64((b.below+through)*mwh))
		}
		j.CurtailedFrac = j.CurtailedMWh / j.SumMWh
		j.FullFrac = j.DeliveredMWh / full
		for i := range j.Parts {
			p, b := &j.Parts[i], &partBins[at*k+i]
			if peak > limit {
				p.CutMWh = float64(max(0, b.kw-float64(limit*b.share)) * mwh)
			}
			if p.EnergyMWh > 0 {
				p.CutFrac = p.CutMWh / p.EnergyMWh
			}
			p.AloneDeliveredMWh = p.EnergyMWh
			if p.PeakKW > limit {
				p.AloneDeliveredMWh = min(p.EnergyMWh, float64((b.aloneBelow+float64(limit*float64(b.aloneHours)))*mwh))
			}
			p.AloneFullFrac = p.AloneDeliveredMWh / full
		}
	}
	return out, nil
}

// reached gives how many of the sorted limits a power reaches.
func reached(limits []float64, kw float64) int {
	low, high := 0, len(limits)
	for low < high {
		if mid := int(uint(low+high) >> 1); limits[mid] <= kw {
			low = mid + 1
		} else {
			high = mid
		}
	}
	return low
}

// Correlation gives how two series go together, hour by hour, from −1 to 1:
//
//	r = Σ(a − ā)(b − b̄)/√(Σ(a − ā)²·Σ(b − b̄)²)
//
// a and b have one length and any unit. Not a number is not known: the hour is left out, also of the means. The
// result is not known where a series does not change or fewer than two hours are left. All hours count, the dark
// ones too: within a season or by day alone it differs. Errors wrap ErrInput:
// lengths that differ, an infinite value. Source: Pearson 1896, Phil. Trans. R. Soc. A 187:253.
func Correlation(a, b []float64) (Number, error) {
	if len(a) != len(b) {
		return Number{}, bounds.Error("number of values", float64(len(b)), "the same in both series")
	}
	n, ma, mb := 0, 0.0, 0.0
	lowA, highA, lowB, highB := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for h, x := range a {
		y := b[h]
		if math.IsInf(x, 0) || math.IsInf(y, 0) {
			return Number{}, bounds.Error("value of a series", math.Inf(1), "finite")
		}
		if math.IsNaN(x) || math.IsNaN(y) {
			continue
		}
		n++
		ma += x
		mb += y
		lowA, highA = min(lowA, x), max(highA, x)
		lowB, highB = min(lowB, y), max(highB, y)
	}
	// Of a series that does not change the rounding of the mean would make one that does.
	if n < 2 || lowA == highA || lowB == highB {
		return Number{}, nil
	}
	ma /= float64(n)
	mb /= float64(n)
	var saa, sbb, sab float64
	for h, x := range a {
		y := b[h]
		if math.IsNaN(x) || math.IsNaN(y) {
			continue
		}
		da, db := x-ma, y-mb
		saa += float64(da * da)
		sbb += float64(db * db)
		sab += float64(da * db)
	}
	if !(saa > 0 && sbb > 0) {
		return Number{}, nil
	}
	return Known(min(1, max(-1, sab/(math.Sqrt(saa)*math.Sqrt(sbb))))), nil
}
