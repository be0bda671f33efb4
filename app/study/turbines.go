package study

import (
	"context"
	"fmt"
	"io/fs"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"groundtally/assets/citedtable"
	"groundtally/geo"
	"groundtally/scoring/wind"
)

// TurbineRecord is the kind of the records of turbines of the user's own, by their names.
const TurbineRecord RecordKind = "turbine"

// CurvePoint is one line of a power curve as its file gives it.
type CurvePoint struct {
	SpeedMPerS float64 `json:"speed_m_per_s"`
	PowerKW    float64 `json:"power_kw"` // electrical
	Ct         float64 `json:"ct,omitempty"`
	HasCt      bool    `json:"has_ct,omitempty"`
}

// OwnTurbine is a machine with the user's own curve.
type OwnTurbine struct {
	ID             string       `json:"id"`
	Title          string       `json:"title,omitempty"`
	RatedKW        float64      `json:"rated_kw"`
	RotorDiameterM float64      `json:"rotor_diameter_m"`
	CutInMPerS     float64      `json:"cut_in_m_per_s"`  // 0 on putting: the first speed with power
	CutOutMPerS    float64      `json:"cut_out_m_per_s"` // 0 on putting: the last speed with power
	Stall          bool         `json:"stall,omitempty"` // power follows the density of the air
	AirKgPerM3     float64      `json:"air_kg_per_m3"`   // that the curve stands for; 0 on putting: the standard density
	Points         []CurvePoint `json:"points"`
	Source         string       `json:"source,omitempty"` // file, edition or who told
	Reason         string       `json:"reason,omitempty"`
}

// StandardAirKgPerM3 is the density that most curves stand for: IEC 61400-12-1.
const StandardAirKgPerM3 = wind.ReferenceDensityKgPerM3

// Bounds of what a curve can be. Source: common practice; the least and the greatest density of air where people
// live lie well within the first two. aboveRated is how far shipped machines reach above their rated power too.
const (
	leastAirKgPerM3 = 0.6
	mostAirKgPerM3  = 1.6
	mostSpeedMPerS  = 60
	aboveRated      = 1.35
	belowRated      = 0.1  // less than this share of rated power is another unit
	reachesRated    = 0.98 // from here on a curve has reached its rated power
	earlyEndMPerS   = 20
	lateStart       = 0.02 // of rated power: more at the first speed means that slower ones are missing
	lateStartMPerS  = 0.5
)

// TurbineError says why a turbine of the user's own cannot be kept.
type TurbineError struct {
	ID    string
	Curve bool // the curve is at fault, and no other fact of the machine
	Point int  // of the curve, from 1; 0 when no single one is at fault
	What  string
	Cure  string
}

func (e *TurbineError) Error() string {
	s := fmt.Sprintf("turbine %q", e.ID)
	if e.Point > 0 {
		s += fmt.Sprintf(", point %d of its curve", e.Point)
	}
	s += ": " + e.What
	if e.Cure != "" {
		s += ". " + e.Cure
	}
	return s
}

// NoSuchError says in plain words that something named is not there. It is an ErrNotThere.
type NoSuchError struct{ What string }

func (e *NoSuchError) Error() string { return e.What }

// Is makes the error one of what is not there.
func (e *NoSuchError) Is(target error) bool { return target == ErrNotThere }

var turbineName = regexp.MustCompile(`^[\pL\pN][\pL\pN_-]{0,59}$`)

// Check reports why the machine cannot be used, as a *TurbineError.
func (t OwnTurbine) Check() error {
	_, err := t.settled()
	return err
}

// settled gives the machine with what its curve and the standard say in the place of what was not given.
func (t OwnTurbine) settled() (OwnTurbine, error) {
	bad := func(cure, format string, args ...any) (OwnTurbine, error) {
		return t, &TurbineError{ID: t.ID, What: fmt.Sprintf(format, args...), Cure: cure}
	}
	if !turbineName.MatchString(t.ID) {
		return bad("Use letters, digits, _ and -, beginning with a letter or digit, at most 60", "the name cannot be used in settings")
	}
	if t.AirKgPerM3 == 0 {
		t.AirKgPerM3 = StandardAirKgPerM3
	}
	switch {
	case !(t.RatedKW > 0) || math.IsInf(t.RatedKW, 0):
		return bad("Give it in kW", "the rated power must be above zero")
	case !(t.RotorDiameterM > 0) || math.IsInf(t.RotorDiameterM, 0):
		return bad("Give it in metres", "the rotor's diameter must be above zero")
	case !(t.AirKgPerM3 >= leastAirKgPerM3 && t.AirKgPerM3 <= mostAirKgPerM3):
		return bad(fmt.Sprintf("The standard is %g kg/m³", StandardAirKgPerM3), "an air density of %g kg/m³ is not between %g and %g", t.AirKgPerM3, leastAirKgPerM3, mostAirKgPerM3)
	}
	if err := checkCurve(t); err != nil {
		return t, err
	}
	first, last := -1, -1
	for i, p := range t.Points {
		if p.PowerKW > 0 {
			if first < 0 {
				first = i
			}
			last = i
		}
	}
	if first < 0 {
		return t, &TurbineError{ID: t.ID, Curve: true, What: "the curve has no power above zero", Cure: "Check which column holds the power"}
	}
	if t.CutInMPerS == 0 {
		t.CutInMPerS = t.Points[first].SpeedMPerS
	}
	if t.CutOutMPerS == 0 {
		t.CutOutMPerS = t.Points[last].SpeedMPerS
	}
	switch {
	case !(t.CutInMPerS >= 0 && t.CutOutMPerS > t.CutInMPerS && t.CutOutMPerS <= mostSpeedMPerS):
		return bad("", "cut-in at %g m/s and cut-out at %g m/s do not rise within 0 to %d m/s", t.CutInMPerS, t.CutOutMPerS, mostSpeedMPerS)
	case t.Points[last].SpeedMPerS > t.CutOutMPerS:
		return t, &TurbineError{ID: t.ID, Curve: true, Point: last + 1, What: fmt.Sprintf("it has power at %g m/s, and cut-out is at %g m/s", t.Points[last].SpeedMPerS, t.CutOutMPerS), Cure: "Correct one of the two"}
	}
	most := t.mostKW()
	switch {
	case most > aboveRated*t.RatedKW:
		return t, &TurbineError{ID: t.ID, Curve: true, What: fmt.Sprintf("the curve reaches %s kW, and rated power is %s kW", plainly(most), plainly(t.RatedKW)), Cure: "Check the unit of the power and the rated power"}
	case most < belowRated*t.RatedKW:
		return t, &TurbineError{ID: t.ID, Curve: true, What: fmt.Sprintf("the curve reaches no more than %s kW, and rated power is %s kW", plainly(most), plainly(t.RatedKW)), Cure: "Check the unit of the power and the rated power"}
	}
	m, err := t.machine()
	if err != nil {
		return t, &TurbineError{ID: t.ID, Curve: true, What: err.Error()}
	}
	if err := m.Check(); err != nil {
		return t, &TurbineError{ID: t.ID, What: err.Error()}
	}
	return t, nil
}

// checkCurve looks at each point, so that an error names the one that is wrong.
func checkCurve(t OwnTurbine) error {
	if len(t.Points) < 2 {
		return &TurbineError{ID: t.ID, Curve: true, What: fmt.Sprintf("a power curve needs at least two speeds, and there are %d", len(t.Points)), Cure: "Give the whole curve, from cut-in to cut-out"}
	}
	for i, p := range t.Points {
		bad := func(cure, format string, args ...any) error {
			return &TurbineError{ID: t.ID, Curve: true, Point: i + 1, What: fmt.Sprintf(format, args...), Cure: cure}
		}
		switch {
		case !(p.SpeedMPerS >= 0 && p.SpeedMPerS <= mostSpeedMPerS):
			return bad("Check which column holds the wind speed, and its unit", "a wind speed of %g m/s is not between 0 and %d m/s", p.SpeedMPerS, mostSpeedMPerS)
		case i > 0 && p.SpeedMPerS == t.Points[i-1].SpeedMPerS:
			return bad("Leave one of the two out", "the wind speed %g m/s stands twice", p.SpeedMPerS)
		case i > 0 && p.SpeedMPerS < t.Points[i-1].SpeedMPerS:
			return bad("Sort the rows by wind speed", "the wind speed %g m/s is less than the one before, %g m/s", p.SpeedMPerS, t.Points[i-1].SpeedMPerS)
		case math.IsNaN(p.PowerKW) || math.IsInf(p.PowerKW, 0):
			return bad("Give the power in plain numbers", "the power is no number")
		case p.PowerKW < 0:
			return bad("Write 0 where the machine gives none", "a power of %g kW is below zero", p.PowerKW)
		case p.HasCt != t.Points[0].HasCt:
			return bad("Fill the column, or leave the whole of it out", "some speeds have a thrust coefficient and others have none")
		case p.HasCt && !(p.Ct >= 0 && p.Ct <= 2):
			return bad("Check which column holds the thrust coefficient", "a thrust coefficient of %g is not between 0 and 2", p.Ct)
		}
	}
	return nil
}

// plainly writes a number without an exponent.
func plainly(x float64) string { return strconv.FormatFloat(x, 'f', -1, 64) }

func (t OwnTurbine) mostKW() float64 {
	most := 0.0
	for _, p := range t.Points {
		most = math.Max(most, p.PowerKW)
	}
	return most
}

// HasCt reports whether the curve gives thrust; without it the wake rests on an estimate.
func (t OwnTurbine) HasCt() bool { return len(t.Points) > 0 && t.Points[0].HasCt }

// Called gives what people call the machine.
func (t OwnTurbine) Called() string { return first(t.Title, t.ID) }

// Machine gives the turbine for computing. All curves of the program stand for the standard density, so a curve for
// another one is normalised to it.
//
//	pitch control: v = v_file · (rho/1.225)^(1/3);  stall: P = P_file · 1.225/rho
//
// Source: IEC 61400-12-1.
func (t OwnTurbine) Machine() (wind.Turbine, error) {
	t, err := t.settled()
	if err != nil {
		return wind.Turbine{}, err
	}
	return t.machine()
}

func (t OwnTurbine) machine() (wind.Turbine, error) {
	points := make([]wind.CurvePoint, len(t.Points))
	for i, p := range t.Points {
		v, kw := p.SpeedMPerS, p.PowerKW
		switch {
		case t.AirKgPerM3 == StandardAirKgPerM3: // so that the digits stay those of the file
		case t.Stall:
			kw *= StandardAirKgPerM3 / t.AirKgPerM3
		default:
			v = wind.NormalisedSpeed(v, t.AirKgPerM3)
		}
		points[i] = wind.CurvePoint{SpeedMPerS: v, PowerKW: kw, Ct: p.Ct, HasCt: p.HasCt}
	}
	curve, err := wind.NewPowerCurve(points)
	return wind.Turbine{ID: t.ID, Name: t.Called(), RatedKW: t.RatedKW, RotorDiameterM: t.RotorDiameterM, CutInMPerS: t.CutInMPerS, CutOutMPerS: t.CutOutMPerS, Source: t.Source, Stall: t.Stall, Curve: curve}, err
}

// Notices tells what is odd about a machine that can be used.
func (t OwnTurbine) Notices() []geo.Notice {
	var out []geo.Notice
	say := func(n geo.Notice) {
		if n.Args == nil {
			n.Args = map[string]string{}
		}
		n.Args["turbine"] = t.ID
		out = append(out, n)
	}
	t, err := t.settled()
	if err != nil {
		return nil
	}
	num := func(x float64) string { return strconv.FormatFloat(x, 'g', 6, 64) }
	most, top, clipped, clippedAt := t.mostKW(), 0, 0, 0.0
	least, widest := math.Inf(1), 0.0
	end := t.Points[0].SpeedMPerS
	for i, p := range t.Points {
		if p.PowerKW == most && t.Points[top].PowerKW < most {
			top = i
		}
		if p.PowerKW > 0 {
			end = p.SpeedMPerS
		}
		if p.HasCt && p.Ct > wind.MaxCt {
			if clipped++; clipped == 1 {
				clippedAt = p.SpeedMPerS
			}
		}
		if i > 0 {
			step := p.SpeedMPerS - t.Points[i-1].SpeedMPerS
			least, widest = math.Min(least, step), math.Max(widest, step)
		}
	}
	if most > t.RatedKW {
		say(geo.Notice{Code: "turbine_above_rated", Severity: geo.Warning, Args: map[string]string{"kw": num(most), "speed": num(t.Points[top].SpeedMPerS), "rated": num(t.RatedKW)}})
	}
	if most < reachesRated*t.RatedKW {
		say(geo.Notice{Code: "turbine_below_rated", Severity: geo.Warning, Args: map[string]string{"kw": num(most), "rated": num(t.RatedKW)}})
	}
	for i := 1; i <= top; i++ {
		if a, b := t.Points[i-1], t.Points[i]; b.PowerKW < a.PowerKW && a.PowerKW < reachesRated*t.RatedKW {
			say(geo.Notice{Code: "turbine_power_falls", Severity: geo.Warning, Args: map[string]string{"from": num(a.PowerKW), "to": num(b.PowerKW), "slower": num(a.SpeedMPerS), "faster": num(b.SpeedMPerS)}})
		}
	}
	if p := t.Points[0]; p.PowerKW > lateStart*t.RatedKW || p.SpeedMPerS > t.CutInMPerS+lateStartMPerS {
		say(geo.Notice{Code: "turbine_starts_late", Severity: geo.Warning, Args: map[string]string{"speed": num(p.SpeedMPerS), "kw": num(p.PowerKW)}})
	}
	if end < earlyEndMPerS || end < t.CutOutMPerS {
		say(geo.Notice{Code: "turbine_ends_early", Severity: geo.Warning, Args: map[string]string{"speed": num(end)}})
	}
	if !t.HasCt() {
		say(geo.Notice{Code: "turbine_no_thrust", Severity: geo.Warning})
	}
	if clipped > 0 {
		say(geo.Notice{Code: "turbine_thrust_clipped", Severity: geo.Info, Args: map[string]string{"count": strconv.Itoa(clipped), "most": num(wind.MaxCt), "speed": num(clippedAt)}})
	}
	if widest > least*1.01 {
		say(geo.Notice{Code: "turbine_uneven_steps", Severity: geo.Info, Args: map[string]string{"least": num(least), "most": num(widest)}})
	}
	return out
}

// PutTurbine keeps a machine of the user's own, in the place of one of its name, as one journal entry. What is
// wrong with it comes back as a *TurbineError.
func (s *Study) PutTurbine(ctx context.Context, t OwnTurbine, reason string) error {
	t.ID, t.Title, t.Source = strings.TrimSpace(t.ID), strings.TrimSpace(t.Title), strings.TrimSpace(t.Source)
	t.Reason = first(strings.TrimSpace(reason), strings.TrimSpace(t.Reason))
	t.Points = slices.Clone(t.Points)
	t, err := t.settled()
	if err != nil {
		return err
	}
	snap, err := s.Snapshot()
	if err != nil {
		return err
	}
	taken := slices.Clone(s.cat.Turbines)
	for _, o := range snap.turbines {
		if o.ID != t.ID {
			taken = append(taken, o.ID)
		}
	}
	for _, id := range taken {
		if strings.EqualFold(id, t.ID) {
			return &TurbineError{ID: t.ID, What: fmt.Sprintf("there is one called %q already", id), Cure: "Choose another name"}
		}
	}
	_, err = s.Edit(ctx, "turbine", t.Reason, []Change{{Kind: TurbineRecord, Key: t.ID, New: Canonical(t)}}, nil)
	return err
}

// RemoveTurbine takes a machine of the user's own out, as one journal entry; not while a plant option names it.
func (s *Study) RemoveTurbine(ctx context.Context, id, reason string) error {
	snap, err := s.Snapshot()
	if err != nil {
		return err
	}
	if _, own := snap.Turbine(id); !own {
		if slices.Contains(s.cat.Turbines, id) {
			return &TurbineError{ID: id, What: "it ships with the program and cannot be taken out"}
		}
		names := make([]string, len(snap.turbines))
		for i, t := range snap.turbines {
			names[i] = t.ID
		}
		there := "it has none"
		if len(names) > 0 {
			there = "they are: " + few(names, 12)
		}
		return &NoSuchError{fmt.Sprintf("the study has no turbine %q of its own; %s", id, there)}
	}
	if users := snap.TurbineUsers(id); len(users) > 0 {
		one := "plant option"
		if len(users) > 1 {
			one = "plant options"
		}
		return &TurbineError{ID: id, What: fmt.Sprintf("the %s %s %s its curve", one, few(users, 12), map[bool]string{true: "use", false: "uses"}[len(users) > 1]),
			Cure: fmt.Sprintf("Give another curve first: gtally set STUDY.gpkg plant.%s.turbine NAME", users[0])}
	}
	_, err = s.Edit(ctx, "remove turbine", reason, []Change{{Kind: TurbineRecord, Key: id}}, nil)
	return err
}

// Turbines gives the machines of the user's own, by name.
func (n *Snapshot) Turbines() []OwnTurbine { return slices.Clone(n.turbines) }

// Turbine gives the machine of the user's own with the name.
func (n *Snapshot) Turbine(id string) (OwnTurbine, bool) {
	for _, t := range n.turbines {
		if t.ID == id {
			return t, true
		}
	}
	return OwnTurbine{}, false
}

// TurbineUsers gives the plant options that name a curve, sorted.
func (n *Snapshot) TurbineUsers(id string) []string {
	return slices.DeleteFunc(n.Names("plant", "turbine"), func(plant string) bool { return n.Text("plant."+plant+".turbine") != id })
}

// TurbineNotices tells what is odd about the machines of the user's own.
func (n *Snapshot) TurbineNotices() []geo.Notice {
	var out []geo.Notice
	for _, t := range n.turbines {
		out = append(out, t.Notices()...)
	}
	return out
}

// shippedTurbines reads the names of the machines that ship with the program.
func shippedTurbines(fsys fs.FS) ([]string, error) {
	t, err := citedtable.ParseFS(fsys, "params/turbines.csv")
	if err != nil {
		return nil, err
	}
	out := make([]string, len(t.Rows))
	for i, r := range t.Rows {
		out[i] = r.Text("turbine")
	}
	return out, nil
}
