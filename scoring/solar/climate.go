package solar

import (
	"fmt"
	"math"
	"time"

	"groundtally/scoring/sun"
	"groundtally/scoring/units"
)

// ClimateInput is the sunlight of a place, month by month, January first.
type ClimateInput struct {
	LatDeg, LonDeg float64
	GHIKWhPerM2    [12]float64  // light on the horizontal, sum of the month
	DHIKWhPerM2    *[12]float64 // its diffuse part, nil to take it from ErbsDaily
	TempC          [12]float64  // air, mean of day and night
	Albedo         [12]float64  // of the ground, 0 to 1
}

// EveryMonth gives twelve times the same value.
func EveryMonth(v float64) (a [12]float64) {
	for i := range a {
		a[i] = v
	}
	return a
}

// InputError says which input cannot be used and what it should be.
type InputError struct {
	Field string
	Value float64
	Want  string
}

func (e *InputError) Error() string {
	return fmt.Sprintf("solar input %s is %v; it should be %s", e.Field, e.Value, e.Want)
}

func within(field string, v, low, high float64) error {
	if !(v >= low && v <= high) {
		return &InputError{Field: field, Value: v, Want: fmt.Sprintf("from %v to %v", low, high)}
	}
	return nil
}

func firstError(errs ...error) error {
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// MonthNoteKind says what was done to a month's input.
type MonthNoteKind string

// The kinds of note on a month. TooClear: clearness over 0.80, the light was lowered to 0.80 of that
// above the atmosphere. VeryDull: clearness under 0.05, used as given. NoSun: light was given for a month
// whose sun does not rise, it was left out. DiffuseBounded: the diffuse light given would need more
// beam than NewClimate allows, the nearest possible was used.
const (
	TooClear       MonthNoteKind = "too_clear"
	VeryDull       MonthNoteKind = "very_dull"
	NoSun          MonthNoteKind = "no_sun"
	DiffuseBounded MonthNoteKind = "diffuse_bounded"
)

// MonthNote is a note on one month.
type MonthNote struct {
	Month time.Month    `json:"month"`
	Kind  MonthNoteKind `json:"kind"`
	Value float64       `json:"value"` // clearness; kWh/m2 left out; kWh/m2 of diffuse light used
}

const (
	clearnessMostOfMonth = 0.80
	polarLatDeg          = 66.5
	// stepsPerDay parts the time from sunrise to sunset. Against 200 steps the yearly energy moves by at
	// most 0.1 % (TestStepsSuffice).
	stepsPerDay = 28
	// beamMostShare is the most beam over the light above the atmosphere, for a sun over 4.5 degrees. It
	// falls to none at 1.5 degrees: a ramp about the usual cut at 3 degrees, so that results change
	// smoothly with latitude.
	beamMostShare = 0.85
	sinBeamNone   = 0.02617694830787315 // sin 1.5 degrees
	sinBeamFull   = 0.07845909572784494 // sin 4.5 degrees
)

// light is the light of one day type at one moment.
type light struct{ ghi, dhi, dni float64 }

// moment is a time with one light for each day type: a step of a representative day, or an hour of a year.
type moment struct {
	month   int
	hour    int     // of the day, 0 to 23
	first   int     // in Climate.suns
	count   int     // how many suns it has
	light   int     // in Climate.lights: first of its types
	sinE    float64 // mean over its suns of the sine of the height, over the horizontal
	gon     float64 // W/m2
	zenith  float64 // radians
	airMass float64
	airC    float64
	windMS  float64 // at the panels; negative: the plant's own
	weight  float64 // hours in the year for which one day type stands at this moment, in units of 1000
}

// sunAt is the sun at an instant.
type sunAt struct {
	v       sun.Vec
	height  float64 // degrees over the horizontal
	bearing float64 // degrees from north
}

func newSunAt(v sun.Vec) sunAt { return sunAt{v, v.ElevationDeg(), v.AzimuthDeg()} }

// Climate is the sunlight of a place spread over moments, ready for any number of plants. It does not
// change and may be shared between goroutines.
type Climate struct {
	in      ClimateInput
	types   int // lights of a moment
	moments []moment
	suns    []sunAt
	lights  []light
	// edges are the suns at the beginning and the end of the moments, two for each; none where moments have
	// several suns.
	edges []sunAt
	hours Hours       // of the file, none where months were given
	slots []int32     // hour of each moment, none where months were given
	ghi   [12]float64 // kWh/m2 in use
	dhi   [12]float64
	notes []MonthNote
}

// Notes tells what was done to months whose input could not be used as given.
func (c *Climate) Notes() []MonthNote { return append([]MonthNote(nil), c.notes...) }

// LatDeg gives the latitude.
func (c *Climate) LatDeg() float64 { return c.in.LatDeg }

// GHIKWhPerM2 gives the light on the horizontal in use; DHIKWhPerM2 its diffuse part.
func (c *Climate) GHIKWhPerM2() [12]float64 { return c.ghi }

// DHIKWhPerM2 gives the diffuse light on the horizontal in use.
func (c *Climate) DHIKWhPerM2() [12]float64 { return c.dhi }

func (in *ClimateInput) check() error {
	err := firstError(within("LatDeg", in.LatDeg, -90, 90), within("LonDeg", in.LonDeg, -360, 360))
	for m := range 12 {
		err = firstError(err,
			within(fmt.Sprintf("GHIKWhPerM2[%d]", m+1), in.GHIKWhPerM2[m], 0, 1000),
			within(fmt.Sprintf("TempC[%d]", m+1), in.TempC[m], -80, 60),
			within(fmt.Sprintf("Albedo[%d]", m+1), in.Albedo[m], 0, 1))
		if in.DHIKWhPerM2 != nil {
			err = firstError(err, within(fmt.Sprintf("DHIKWhPerM2[%d]", m+1), in.DHIKWhPerM2[m], 0, in.GHIKWhPerM2[m]))
		}
	}
	return err
}

// day is a representative day of a month.
type day struct{ declDeg, normal, sunsetDeg, extraWh float64 }

// daysFor gives the representative days of a month: one with the month's mean declination, beyond the
// polar circles the 5th, 15th and 25th. Days without sun are left out; when it rises on none of the
// three, the day with the most light of the month stands for it.
func daysFor(latDeg, lonDeg float64, month time.Month, meanDeclDeg, meanNormal float64) []day {
	make1 := func(declDeg, normal float64) day {
		return day{declDeg, normal, sunsetDeg(latDeg, declDeg), sun.DailyWhPerM2(normal, latDeg, declDeg)}
	}
	if math.Abs(latDeg) <= polarLatDeg {
		return []day{make1(meanDeclDeg, meanNormal)}
	}
	of := func(d int) day {
		a := sun.NoonOf(month, d, lonDeg)
		return make1(a.DeclinationDeg, sun.NormalWPerM2(a.DistanceAU))
	}
	var out []day
	for _, d := range [3]int{5, 15, 25} {
		if x := of(d); x.extraWh > 0 {
			out = append(out, x)
		}
	}
	if len(out) > 0 {
		return out
	}
	best := of(1)
	for d := 2; d <= sun.DaysInMonth(month); d++ {
		if x := of(d); x.extraWh > best.extraWh {
			best = x
		}
	}
	if best.extraWh > 0 {
		return []day{best}
	}
	return nil
}

func sunsetDeg(latDeg, declDeg float64) float64 { return sun.SunsetHourAngleDeg(latDeg, declDeg) }

// NewClimate spreads monthly sums over hours, without random numbers.
//
// Each month has DayTypes equally likely days of clearness DayClearness(K), K the month's sum over the
// mean light above the atmosphere. A day's light follows HourShare over equal steps from sunrise to
// sunset of the month's mean declination. ErbsHourly gives the course of the diffuse light over the day;
// one factor for each day type brings its sum to ErbsDaily, or one more for the month to the diffuse sum
// that was given. Beam is at most 0.85 of that above the atmosphere, less with the sun
// under 4.5 degrees and none under 1.5. Air temperature follows TemperatureSwing. The sums of the months are kept exactly, except
// where Notes says otherwise.
//
// A month with more light than above the atmosphere is refused. Within 66.5 degrees of the equator one
// day stands for a month, beyond it three.
func NewClimate(in ClimateInput) (*Climate, error) { return newClimate(in, stepsPerDay) }

func newClimate(in ClimateInput, steps int) (*Climate, error) {
	if err := in.check(); err != nil {
		return nil, err
	}
	c := &Climate{in: in, types: DayTypes, moments: make([]moment, 0, 12*steps)}
	if in.DHIKWhPerM2 != nil {
		given := *in.DHIKWhPerM2
		c.in.DHIKWhPerM2 = &given
	}
	for m := range 12 {
		if err := c.addMonth(m, steps); err != nil {
			return nil, err
		}
	}
	return c, nil
}

// darkWhPerM2 is the daily light above the atmosphere under which a month counts as twilight: its
// clearness says nothing about the units of the input.
const darkWhPerM2 = 200.0

func (c *Climate) addMonth(m, steps int) error {
	month := time.Month(m + 1)
	nDays := float64(sun.DaysInMonth(month))
	given := c.in.GHIKWhPerM2[m]
	declDeg, normal, meanExtra := sun.MonthMean(c.in.LatDeg, c.in.LonDeg, month)
	days := daysFor(c.in.LatDeg, c.in.LonDeg, month, declDeg, normal)
	if meanExtra <= 0 || len(days) == 0 {
		if given > 0 {
			c.notes = append(c.notes, MonthNote{month, NoSun, given})
		}
		return nil
	}
	K := given * units.WPerKW / nDays / meanExtra
	switch {
	case K > 1 && meanExtra > darkWhPerM2:
		return &InputError{
			Field: fmt.Sprintf("GHIKWhPerM2[%d]", m+1), Value: given,
			Want: fmt.Sprintf("at most %.1f, the light above the atmosphere; a month in MJ/m2 must be divided by %v", meanExtra*nDays/units.WPerKW, units.MJPerKWh),
		}
	case K > clearnessMostOfMonth:
		c.notes = append(c.notes, MonthNote{month, TooClear, K})
		K = clearnessMostOfMonth
	case K < clearnessLeast:
		c.notes = append(c.notes, MonthNote{month, VeryDull, K})
	}
	repExtra := 0.0
	for _, d := range days {
		repExtra += d.extraWh
	}
	// scale makes the representative days give the month's light exactly.
	scale := meanExtra * float64(len(days)) / repExtra
	k := DayClearness(K)
	first := len(c.moments)
	for _, d := range days {
		c.addDay(m, steps, d, scale, nDays/float64(len(days)*DayTypes), K, &k)
	}
	month1 := c.moments[first:]
	if c.in.DHIKWhPerM2 != nil && given > 0 {
		want := c.in.DHIKWhPerM2[m] * (K * meanExtra * nDays / units.WPerKW / given)
		if got := c.fitMonthDiffuse(month1, want); math.Abs(got-want) > 1e-6*(want+1) {
			c.notes = append(c.notes, MonthNote{month, DiffuseBounded, got})
		}
	}
	c.sum(month1)
	return nil
}

// sum adds the light of moments to that of their months.
func (c *Climate) sum(moments []moment) {
	for i := range moments {
		mo := &moments[i]
		for _, l := range c.of(mo) {
			c.ghi[mo.month] += float64(mo.weight * l.ghi)
			c.dhi[mo.month] += float64(mo.weight * l.dhi)
		}
	}
}

// of gives the lights of a moment.
func (c *Climate) of(mo *moment) []light { return c.lights[mo.light : mo.light+c.types] }

func (c *Climate) addDay(m, steps int, d day, scale, daysPerType, K float64, k *[DayTypes]float64) {
	first := len(c.moments)
	width := 2 * d.sunsetDeg / float64(steps)
	hours := width / 15
	sum := 0.0
	shares := make([]float64, steps)
	// The outer edges lie a trace inside the day: on the horizon itself shadows have no end.
	edge := func(i int) sunAt {
		w := -d.sunsetDeg + float64(width*float64(i))
		return newSunAt(sun.VectorAt(c.in.LatDeg, d.declDeg, float64(w*(1-1e-6))))
	}
	for i := range steps {
		w := -d.sunsetDeg + float64(width*(float64(i)+0.5))
		s := sun.VectorAt(c.in.LatDeg, d.declDeg, w)
		shares[i] = HourShare(w, d.sunsetDeg)
		sum += shares[i]
		c.edges = append(c.edges, edge(i), edge(i+1))
		c.suns = append(c.suns, newSunAt(s))
		c.lights = append(c.lights, make([]light, DayTypes)...)
		c.moments = append(c.moments, moment{
			month: m, hour: int(12+w/15) % 24, first: len(c.suns) - 1, count: 1, light: len(c.lights) - DayTypes,
			sinE: s.Z, gon: float64(d.normal * scale), windMS: -1,
			zenith:  math.Acos(clamp(s.Z, -1, 1)),
			airMass: sun.AirMass(90 - s.ElevationDeg()),
			airC:    c.in.TempC[m] + TemperatureSwing(12+w/15, K),
			weight:  float64(hours*daysPerType) / units.WPerKW,
		})
	}
	mom := c.moments[first:]
	shape, least, most := make([]float64, steps), make([]float64, steps), make([]float64, steps)
	for j := range DayTypes {
		power := k[j] * d.extraWh * scale / (sum * hours)
		total := 0.0
		for i := range mom {
			l := &c.of(&mom[i])[j]
			l.ghi = float64(power * shares[i])
			total += l.ghi
			shape[i] = float64(l.ghi * ErbsHourly(l.ghi/max(1e-9, float64(mom[i].gon*mom[i].sinE))))
		}
		want := float64(ErbsDaily(k[j], d.sunsetDeg) * total)
		for i := range mom {
			least[i], most[i] = diffuseBounds(&mom[i], c.of(&mom[i])[j].ghi)
		}
		factor := fitFactor(want, shape, least, most, nil)
		for i := range mom {
			l := &c.of(&mom[i])[j]
			l.dhi = min(most[i], max(least[i], float64(factor*shape[i])))
			l.setBeam(mom[i].sinE)
		}
	}
}

// diffuseBounds gives the least and the most diffuse light that leave a possible beam.
func diffuseBounds(mo *moment, ghi float64) (least, most float64) {
	ramp := clamp((mo.sinE-sinBeamNone)/(sinBeamFull-sinBeamNone), 0, 1)
	return max(0, ghi-float64(beamMostShare*ramp*mo.gon*mo.sinE)), ghi
}

// fitFactor gives the factor at which the shape, times the factor and drawn into its bounds, adds up to
// want (weighted, when weights are given). The sum is piecewise linear in the factor, so that Newton's
// steps end on it exactly; when the bounds do not let it reach want, the factor of the last step stands.
func fitFactor(want float64, shape, least, most, weights []float64) float64 {
	factor := 1.0
	for range 40 {
		fixed, free := 0.0, 0.0
		for i, s := range shape {
			w := 1.0
			if weights != nil {
				w = weights[i]
			}
			switch v := float64(factor * s); {
			case v <= least[i]:
				fixed += float64(w * least[i])
			case v >= most[i]:
				fixed += float64(w * most[i])
			default:
				free += float64(w * s)
			}
		}
		if free <= 0 {
			// All are at a bound: step towards want until one comes free or nothing is left to gain.
			switch {
			case fixed < want*(1-1e-12) && factor < 1e6:
				factor *= 2
			case fixed > want*(1+1e-12) && factor > 1e-6:
				factor /= 2
			default:
				return factor
			}
			continue
		}
		next := max(0, (want-fixed)/free)
		if math.Abs(next-factor) <= 1e-13*factor {
			return next
		}
		factor = next
	}
	return factor
}

// setBeam gives the beam that the diffuse light leaves.
func (l *light) setBeam(sinE float64) {
	l.dni = 0
	if sinE > sinBeamNone {
		l.dni = max(0, l.ghi-l.dhi) / sinE
	}
}

// fitMonthDiffuse brings the diffuse sum of a month to want kWh/m2 by one factor, as near as the bounds
// allow, and gives what it reached.
func (c *Climate) fitMonthDiffuse(mom []moment, want float64) (got float64) {
	n := len(mom) * DayTypes
	shape, least, most, weights := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range mom {
		for j, l := range c.of(&mom[i]) {
			k := i*DayTypes + j
			shape[k], weights[k] = l.dhi, mom[i].weight
			least[k], most[k] = diffuseBounds(&mom[i], l.ghi)
		}
	}
	factor := fitFactor(want, shape, least, most, weights)
	for i := range mom {
		for j := range DayTypes {
			k, l := i*DayTypes+j, &c.of(&mom[i])[j]
			l.dhi = min(most[k], max(least[k], float64(factor*shape[k])))
			got += float64(mom[i].weight * l.dhi)
			l.setBeam(mom[i].sinE)
		}
	}
	return got
}
