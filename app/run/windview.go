package run

import (
	"math"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/fit"
	"groundtally/geo/measure"
	"groundtally/scoring/wind"
)

// Layout tells how the turbines of a plant came to stand where they stand.
type Layout struct {
	How        string   `json:"how"` // what found it, in words; "by hand" where the user placed them
	MostByRule int      `json:"most_by_rule,omitempty"`
	MostBy     string   `json:"most_by,omitempty"`     // the argument behind it
	SpacingMet float64  `json:"spacing_met,omitempty"` // the least distance of two turbines, as a share of the rule's; 0 with fewer than two
	BoundMWh   float64  `json:"bound_mwh,omitempty"`   // no layout of so many gives more, behind no wake; before losses
	WakedMWh   float64  `json:"waked_mwh,omitempty"`   // what this one gives, before losses
	Asked      int      `json:"asked,omitempty"`       // most machines that were wanted; 0 for no limit
	AskedBy    string   `json:"asked_by,omitempty"`    // spare capacity, setting or the usual limit
	Reason     string   `json:"reason,omitempty"`      // of the user, for turbines placed by hand
	Broken     []Broken `json:"broken,omitempty"`      // rules that turbines placed by hand break
}

// Broken is a rule that a turbine placed by hand does not keep.
type Broken struct {
	Turbine int     `json:"turbine"` // from 1
	Rule    string  `json:"rule"`    // outside_site, outside_ground, too_near, near_existing, touching
	Other   int     `json:"other,omitempty"`
	ByM     float64 `json:"by_m,omitempty"`
}

// byHandWords is how a layout was found that the user made.
const byHandWords = "by hand"

// The rules that a turbine placed by hand can break.
const (
	brokenSite     = "outside_site"
	brokenGround   = "outside_ground"
	brokenSpacing  = "too_near"
	brokenExisting = "near_existing"
	brokenTouch    = "touching"
)

// handSlackM is what places lose when they are written in degrees.
const handSlackM = 0.05

// placedByHand gives the places that the user chose, and the rules that they break.
func (f *fitter) placedByHand(hand study.HandLayout, s site, ground geo.XYGeometry, el fit.Spacing, near []neighbour, acrossD, rotorM float64, lay *Layout) ([]geo.XY, error) {
	lay.How, lay.Reason = byHandWords, hand.Reason
	at := make([]geo.XY, len(hand.At))
	for i, ll := range hand.At {
		var err error
		if at[i], err = f.w.frame.Forward(ll); err != nil {
			return nil, siteError(s, err)
		}
	}
	broken := func(b Broken) { lay.Broken = append(lay.Broken, b) }
	for i, p := range at {
		if !measure.Inside(p, s.geom) {
			_, m := measure.NearestOnOutline(p, s.geom)
			broken(Broken{Turbine: i + 1, Rule: brokenSite, ByM: m})
		} else if !measure.Inside(p, ground) {
			b := Broken{Turbine: i + 1, Rule: brokenGround}
			if !ground.Empty() {
				_, b.ByM = measure.NearestOnOutline(p, ground)
			}
			broken(b)
		}
		for j, q := range at[:i] {
			m, d := math.Sqrt(el.Metric(p, q)), p.Dist(q)
			if lay.SpacingMet == 0 || m < lay.SpacingMet {
				lay.SpacingMet = m
			}
			switch {
			case d < rotorM:
				broken(Broken{Turbine: i + 1, Rule: brokenTouch, Other: j + 1, ByM: rotorM - d})
			case d/m-d > handSlackM:
				broken(Broken{Turbine: i + 1, Rule: brokenSpacing, Other: j + 1, ByM: d/m - d})
			}
		}
		for _, n := range near {
			d := p.Dist(n.at)
			switch {
			case d < (rotorM+n.turbine.RotorDiameterM)/2:
				broken(Broken{Turbine: i + 1, Rule: brokenTouch, ByM: (rotorM+n.turbine.RotorDiameterM)/2 - d})
			case d < acrossD*math.Max(rotorM, n.turbine.RotorDiameterM):
				broken(Broken{Turbine: i + 1, Rule: brokenExisting, ByM: acrossD*math.Max(rotorM, n.turbine.RotorDiameterM) - d})
			}
		}
	}
	return at, nil
}

// layoutNotices names turbines placed by hand that stand for nothing: their site or their plant option is gone.
func layoutNotices(snap *study.Snapshot, parcels map[string]bool) []geo.Notice {
	sites := map[string]bool{}
	for p := range parcels {
		sites[p] = true
	}
	for _, g := range snap.Groups {
		sites[g.Site] = true
		for _, p := range g.Parcels {
			if p != g.Site {
				delete(sites, p)
			}
		}
	}
	var out []geo.Notice
	for _, l := range snap.Layouts() {
		technology, _, there := snap.Lookup("plant." + l.Plant + ".technology")
		if !sites[l.Site] || !there || !strings.HasPrefix(technology.Value, windPart) {
			out = append(out, geo.Notice{Code: "layout_idle", Severity: geo.Warning, Args: map[string]string{"site": l.Site, "plant": l.Plant}})
		}
	}
	return out
}

// touches reports whether rotors of turbines placed by hand could touch: then nothing can be computed.
func (l *Layout) touches() bool {
	return slices.ContainsFunc(l.Broken, func(b Broken) bool { return b.Rule == brokenTouch })
}

// TurbineView is what is shown of the turbines of a fitted plant.
type TurbineView struct {
	Curve  *WindCurve
	Wakes  *WakeField
	Models []WakeModelYield // the model that the results use first
}

// WakeModelYield is the yield under one model of wakes.
type WakeModelYield struct {
	Model    string
	WakeLoss float64 // share of the free energy
	NetMWh   float64
}

// WindCurve is the power of one machine over the wind at hub height.
type WindCurve struct {
	Machine                                          string
	Published                                        bool // false for the generic curve
	Bins                                             []WindBin
	RatedKW, MeanSpeedMPerS, CutInMPerS, CutOutMPerS float64
}

// WindBin is half a metre per second of wind.
type WindBin struct {
	SpeedMPerS float64 // its middle
	Time       float64 // share of the year
	PowerKW    float64
	Energy     float64 // share of the machine's energy in the free stream
}

// WakeField is what the wakes take of the wind around a plant, in metres east and north of the middle of its site.
type WakeField struct {
	Columns, Rows      int
	StepM, X0M, Y0M    float64   // of the cells, and of the south-western corner
	Lost               []float64 // share of the mean speed of the free wind, row by row from the south-west
	Turbines, Existing []WakeTurbine
	Site, Buildable    [][]geo.XY // rings
}

// WakeTurbine is a turbine in a wake field.
type WakeTurbine struct {
	X, Y, RotorM float64
	Loss         float64 // share of its energy; not a number for existing ones
}

// windBinMPerS is the width of the bins of a curve over the wind.
const windBinMPerS = 0.5

// curveOver lays a machine's curve over the wind at hub height, in the air that is there.
func curveOver(in wind.FarmInput, res wind.FarmResult, hub []wind.Sector) *WindCurve {
	m := in.Turbine
	out := &WindCurve{Machine: m.Name, Published: m.ID != genericTurbine, RatedKW: m.RatedKW, MeanSpeedMPerS: res.MeanSpeedMPerS}
	toCurve, power := wind.NormalisedSpeed(1, res.AirKgPerM3), 1.0
	if m.Stall {
		toCurve, power = 1, res.AirKgPerM3/wind.ReferenceDensityKgPerM3
	}
	out.CutInMPerS, out.CutOutMPerS = m.Curve.First()/toCurve, m.Curve.Last()/toCurve
	all := 0.0
	for v := 0.0; v < out.CutOutMPerS+windBinMPerS; v += windBinMPerS {
		b := WindBin{SpeedMPerS: v + windBinMPerS/2}
		for _, s := range hub {
			if s.FrequencyFrac > 0 {
				b.Time += float64(s.FrequencyFrac * (s.Weibull.CDF(v+windBinMPerS) - s.Weibull.CDF(v)))
			}
		}
		b.PowerKW = power * m.Curve.PowerKW(b.SpeedMPerS*toCurve)
		b.Energy = b.Time * b.PowerKW
		all += b.Energy
		out.Bins = append(out.Bins, b)
	}
	for i := range out.Bins {
		out.Bins[i].Energy /= all
	}
	return out
}

// The cells of a wake map, and the directions that it is summed over.
const (
	wakeColumns    = 100
	wakeMarginD    = 7 // rotor diameters around the turbines
	wakeDirections = 36
	leastWakeCellM = 10
)

// wakesAround finds what the wakes of a plant take of the wind around it.
func wakesAround(in wind.FarmInput, res wind.FarmResult, siteRings, groundRings [][]geo.XY) (*WakeField, error) {
	out := &WakeField{Site: siteRings, Buildable: groundRings}
	box := geo.EmptyExtent()
	for i, p := range in.At {
		out.Turbines = append(out.Turbines, WakeTurbine{X: p.X, Y: p.Y, RotorM: in.Turbine.RotorDiameterM, Loss: res.Turbines[i].WakeLossFrac})
		box = box.Add(geo.XY(p))
	}
	for _, ring := range siteRings {
		for _, p := range ring {
			box = box.Add(p)
		}
	}
	box = box.Grow(wakeMarginD * in.Turbine.RotorDiameterM)
	for _, m := range in.Existing {
		if box.Meets(geo.EmptyExtent().Add(geo.XY(m.At))) {
			out.Existing = append(out.Existing, WakeTurbine{X: m.At.X, Y: m.At.Y, RotorM: m.Turbine.RotorDiameterM, Loss: math.NaN()})
		}
	}
	w, h := box.MaxX-box.MinX, box.MaxY-box.MinY
	out.StepM = math.Max(leastWakeCellM, math.Ceil(math.Max(w, h)/wakeColumns))
	out.Columns, out.Rows = int(math.Ceil(w/out.StepM)), int(math.Ceil(h/out.StepM))
	out.X0M, out.Y0M = box.MinX, box.MinY
	at := make([]wind.Position, 0, out.Columns*out.Rows)
	for y := range out.Rows {
		for x := range out.Columns {
			at = append(at, wind.Position{X: out.X0M + (float64(x)+0.5)*out.StepM, Y: out.Y0M + (float64(y)+0.5)*out.StepM})
		}
	}
	in.Settings.Directions = wakeDirections
	var err error
	out.Lost, err = wind.WakeMap(in, at)
	return out, err
}

// wakeWords names a model of wakes as the setting does.
func wakeWords(m wind.WakeModel) string {
	for words, one := range wakeModels {
		if one == m {
			return words
		}
	}
	return m.String()
}

// ringsOf gives the rings of polygons through a change of coordinates.
func ringsOf(g geo.XYGeometry, to func(geo.XY) wind.Position) (out [][]geo.XY) {
	for _, part := range g.Parts {
		for _, ring := range part {
			r := make([]geo.XY, len(ring))
			for i, p := range ring {
				r[i] = geo.XY(to(p))
			}
			out = append(out, r)
		}
	}
	return out
}
