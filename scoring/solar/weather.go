package solar

import (
	"fmt"
	"math"
	"sort"
	"time"

	"groundtally/scoring/sun"
	"groundtally/scoring/units"
)

// WeatherRow is one interval of a weather file. What is not known is not a number.
type WeatherRow struct {
	Start         time.Time // of the interval
	GHI, DHI, DNI float64   // W/m2, means over the interval
	TempC         float64
	WindMS        float64
}

// WeatherInput is a file of hours, or of whole parts of an hour, for one place.
type WeatherInput struct {
	LatDeg, LonDeg float64
	ElevationM     float64 // above sea level
	Step           time.Duration
	Rows           []WeatherRow // in any order
	ClockOffset    time.Duration
	// WindFactor brings the file's wind to the height of the panels; WindAtPanelMS does so from 10 m.
	WindFactor float64
	Albedo     [12]float64
	Split      SplitModel
}

// SplitModel is a published way to part an hour's light into beam and diffuse.
type SplitModel uint8

// The models of an hour's diffuse share. Erbs is the default.
const (
	Erbs SplitModel = iota
	OrgillHollands
	Reindl
)

func (m SplitModel) String() string { return [...]string{"Erbs", "Orgill-Hollands", "Reindl"}[m] }

// DiffuseShare gives the diffuse share of an hour's light from its clearness and the sine of the sun's height.
func (m SplitModel) DiffuseShare(kt, sinElevation float64) float64 {
	switch m {
	case OrgillHollands:
		return OrgillHollandsHourly(kt)
	case Reindl:
		return ReindlHourly(kt, sinElevation)
	}
	return ErbsHourly(kt)
}

// OrgillHollandsHourly gives the diffuse share of an hour's light from its clearness k:
//
//	k < 0.35: 1 - 0.249 k;  k <= 0.75: 1.557 - 1.84 k;  above: 0.177
//
// k is drawn into [0, 1]. Source: Orgill and Hollands 1977, Solar Energy 19:357.
func OrgillHollandsHourly(kt float64) float64 {
	k := clamp(kt, 0, 1)
	switch {
	case k < 0.35:
		return 1 - float64(0.249*k)
	case k <= 0.75:
		return 1.557 - float64(1.84*k)
	}
	return 0.177
}

// ReindlHourly gives the same from the clearness k and s, the sine of the sun's height:
//
//	k <= 0.30: 1.020 - 0.254 k + 0.0123 s, at most 1
//	k <  0.78: 1.400 - 1.749 k + 0.177 s, within [0.1, 0.97]
//	above:     0.486 k - 0.182 s, at least 0.1
//
// k is drawn into [0, 1]. Source: Reindl, Beckman and Duffie 1990, Solar Energy 45:1.
func ReindlHourly(kt, sinElevation float64) float64 {
	k := clamp(kt, 0, 1)
	switch {
	case k <= 0.30:
		return min(1, 1.020-float64(0.254*k)+float64(0.0123*sinElevation))
	case k < 0.78:
		return clamp(1.400-float64(1.749*k)+float64(0.177*sinElevation), 0.1, 0.97)
	}
	return max(0.1, float64(0.486*k)-float64(0.182*sinElevation))
}

// WeatherReport says what was found in a file and what was done to it. Counts are of intervals.
type WeatherReport struct {
	Years       int  // that the file stands for
	Typical     bool // months come from different years; the sun is that of sun.TypicalYear
	LeapDropped int  // of 29 February
	Twice       int  // with the time of another, left out
	Missing     int  // that the years want and the file does not have, or has without light or temperature
	FilledShort int  // of those: filled from the hours around, gaps of up to 3 hours
	FilledLong  int  // filled from the same hour of the days around
	Negative    int  // light below 0, set to 0
	AtNight     int  // more than 5 W/m2 with the sun more than 1 degree below the horizon
	TooBright   int  // over a limit of what is possible, see NewWeather
	NotClosing  int  // of the three lights do not agree: the light on the horizontal was kept and parted again
	Parted      int  // where beam and diffuse light were parted by the model
	Bounded     int  // where the beam was lowered to the most that is possible
	NoWind      int  // where the plant's own wind is used
	ShiftMin    int  // by which the times fit the sun best
	ShiftKnown  bool // enough clear days
	GHIKWhPerM2 [12]float64
	DHIKWhPerM2 [12]float64
	MeanTempC   [12]float64
}

// MissingShare gives the share of intervals that had to be filled.
func (r *WeatherReport) MissingShare(step time.Duration) float64 {
	return float64(r.Missing) / (float64(r.Years) * units.HoursPerYear / step.Hours())
}

// Limits of what can be filled and of what is suspicious.
const (
	mostMissingShare = 0.10
	shortGap         = 3 * time.Hour
	sunsPerHour      = 6
	// ShiftTolerableMin is the shift of times from which on their meaning is in doubt.
	ShiftTolerableMin = 15
)

// NewWeather makes a Climate of a file of hours.
//
// The rows are laid on whole years of 365 days: 29 February is left out. When their months come from different
// years the sun is that of sun.TypicalYear. Gaps of up to 3 hours are filled evenly in clearness and temperature,
// longer ones from the same hour of the nearest days; over a tenth missing is refused. The sun is taken at 6
// instants an hour (apparent, with refraction, for the beam's way; geometric for light above the atmosphere),
// so that hours with sunrise and sunset need no rule of their own.
//
// Light below 0 counts as 0. Of the three lights any two give the third; where all are there and do not close
// within 8 % (15 % with the sun under 15 degrees; where the first is over 50 W/m2), or one is over the most that is
// possible, the light on the horizontal is kept and parted by the SplitModel, as where it stands alone. With the
// sun under 3 degrees all is diffuse; the beam is at most 0.85 of that above the atmosphere. Limits: Long and
// Dutton 2002, Long and Shi 2008; filling, the last two bounds: common practice.
func NewWeather(in WeatherInput) (*Climate, WeatherReport, error) {
	w := weather{in: &in}
	if err := w.check(); err != nil {
		return nil, w.report, err
	}
	if err := w.lay(); err != nil {
		return nil, w.report, err
	}
	w.suns()
	w.shift()
	if err := w.fill(); err != nil {
		return nil, w.report, err
	}
	c := w.climate()
	w.report.GHIKWhPerM2, w.report.DHIKWhPerM2 = c.ghi, c.dhi
	return c, w.report, nil
}

// weather is a file on its way to a Climate.
type weather struct {
	in     *WeatherInput
	report WeatherReport
	perDay int
	slots  []slot
	first  int     // number of the first slot, see index
	all    []sunAt // of the slots, in their order
	each   int     // suns of a slot
}

// slot is an interval of the years.
type slot struct {
	WeatherRow
	there bool
	row   int     // in the file's rows, negative where it has none
	year  int     // of the row
	sinE  float64 // mean of the geometric height, over the horizontal
	gon   float64
	top   float64 // greatest geometric height in degrees
}

func (w *weather) check() error {
	in := w.in
	if err := firstError(within("LatDeg", in.LatDeg, -90, 90), within("LonDeg", in.LonDeg, -360, 360), within("ElevationM", in.ElevationM, -500, 9000), within("WindFactor", in.WindFactor, 0, 5)); err != nil {
		return err
	}
	if in.Step < time.Minute || in.Step > time.Hour || time.Hour%in.Step != 0 {
		return &InputError{"Step", in.Step.Hours(), "an hour or a whole part of one"}
	}
	if in.Split > Reindl {
		return &InputError{"Split", float64(in.Split), "a model of an hour's diffuse share"}
	}
	for m := range 12 {
		if err := within(fmt.Sprintf("Albedo[%d]", m+1), in.Albedo[m], 0, 1); err != nil {
			return err
		}
	}
	w.perDay = int(24 * time.Hour / in.Step)
	w.each = max(1, int(float64(sunsPerHour)*in.Step.Hours()+0.5))
	return nil
}

const daysPerYear = 365

// lay puts the rows on whole years.
func (w *weather) lay() error {
	rows := make([]placed, 0, len(w.in.Rows))
	for i, r := range w.in.Rows {
		r.Start = r.Start.UTC()
		if r.Start.Month() == time.February && r.Start.Day() == 29 {
			w.report.LeapDropped++
			continue
		}
		rows = append(rows, placed{r, i})
	}
	if len(rows) == 0 {
		return &InputError{"Rows", 0, "at least a year of rows"}
	}
	sort.SliceStable(rows, func(i, j int) bool { return rows[i].Start.Before(rows[j].Start) })
	perYear := daysPerYear * w.perDay
	var yearOf [12]int
	yearOf, w.report.Typical = typical(rows, perYear)
	if w.report.Typical {
		w.report.Years = 1
	} else {
		from, to := rows[0].Start, rows[len(rows)-1].Start
		years := float64(w.index(to)-w.index(from)+1) / float64(perYear)
		w.report.Years = int(math.Round(years))
		if w.report.Years < 1 || math.Abs(years-float64(w.report.Years)) > mostMissingShare {
			return &InputError{"Rows", float64(len(rows)), fmt.Sprintf("whole years: from %s to %s they are %.2f", from.Format(time.DateOnly), to.Format(time.DateOnly), years)}
		}
	}
	w.slots = make([]slot, w.report.Years*perYear)
	for i := range w.slots {
		w.slots[i].row = -1
	}
	w.first = sun.TypicalYear * perYear
	if !w.report.Typical {
		w.first = w.index(rows[0].Start)
	}
	for _, r := range rows {
		i := w.index(r.Start)
		if w.report.Typical {
			i %= perYear
		} else if i -= w.first; i >= len(w.slots) {
			i -= len(w.slots) // the last of a file that runs over by some rows
		}
		s := &w.slots[i]
		if s.there {
			w.report.Twice++
			continue
		}
		s.WeatherRow, s.there, s.row, s.year = r.WeatherRow, true, r.row, r.Start.Year()
		if !finite(r.TempC) || !finite(r.GHI) && !(finite(r.DHI) && finite(r.DNI)) {
			s.there = false
		}
	}
	for i := range w.slots {
		s := &w.slots[i]
		s.Start = w.time(w.first + i)
		if s.row < 0 {
			s.year = s.Start.Year()
			if y := yearOf[s.Start.Month()-1]; w.report.Typical && y > 0 {
				s.year = y
			}
		}
		if !s.there {
			w.report.Missing++
		}
	}
	if share := w.report.MissingShare(w.in.Step); share > mostMissingShare {
		return &InputError{"Rows", float64(len(rows)), fmt.Sprintf("nearly complete: %.1f %% of the years' hours are missing, at most 10 %% can be filled", 100*share)}
	}
	return nil
}

// placed is a row with its place in the file.
type placed struct {
	WeatherRow
	row int
}

// typical reports that the rows are a year put together from months of different years: the years of its
// months differ, and no month stands twice. It gives the years, 0 for a month without rows.
func typical(rows []placed, perYear int) (years [12]int, ok bool) {
	for _, r := range rows {
		// The file's own zone may put some hours of a month over its border.
		if d := r.Start.Day(); d < 3 || d > 26 {
			continue
		}
		switch y := &years[r.Start.Month()-1]; *y {
		case 0:
			*y = r.Start.Year()
		case r.Start.Year():
		default:
			return years, false
		}
	}
	// A year that begins within a year goes over one border of years; months from here and there go over more.
	borders := 0
	for m := range years {
		if years[m] != years[(m+1)%12] {
			borders++
		}
	}
	return years, borders > 2 && len(rows) <= perYear+2*24
}

// index numbers the intervals of years of 365 days.
func (w *weather) index(t time.Time) int {
	day := t.YearDay() - 1
	if leap(t.Year()) && day > 58 {
		day--
	}
	into := t.Sub(time.Date(t.Year(), t.Month(), t.Day(), 0, 0, 0, 0, time.UTC))
	return (t.Year()*daysPerYear+day)*w.perDay + int(into/w.in.Step)
}

// time is the beginning of an interval.
func (w *weather) time(index int) time.Time { return timeOf(index, w.perDay, w.in.Step) }

func timeOf(index, perDay int, step time.Duration) time.Time {
	day, part := index/perDay, index%perDay
	year, day := day/daysPerYear, day%daysPerYear
	if leap(year) && day > 58 {
		day++
	}
	return time.Date(year, time.January, 1+day, 0, 0, 0, 0, time.UTC).Add(time.Duration(part) * step)
}

func leap(year int) bool { return year%4 == 0 && (year%100 != 0 || year%400 == 0) }

// suns finds the sun of every slot.
func (w *weather) suns() {
	in := w.in
	air := sun.StandardAir(in.ElevationM)
	w.all = make([]sunAt, len(w.slots)*w.each)
	piece := in.Step / time.Duration(w.each)
	for i := range w.slots {
		s := &w.slots[i]
		a := sun.At(sun.JulianDay(s.Start.Add(in.Step / 2)))
		s.gon, s.top = sun.NormalWPerM2(a.DistanceAU), -90
		for k := range w.each {
			// The sun's own place changes by a thousandth of a degree within the hour, the earth turns.
			at := s.Start.Add(time.Duration(k)*piece + piece/2)
			p := sun.At(sun.JulianDay(at)).Seen(in.LatDeg, in.LonDeg, air)
			w.all[i*w.each+k] = sunAt{p.Vector(), p.ApparentElevationDeg, p.AzimuthDeg}
			s.sinE += max(0, sind(p.GeometricDeg)) / float64(w.each)
			s.top = max(s.top, p.GeometricDeg)
		}
	}
}

// shift finds the shift of times at which the light of clear days follows the sun best.
func (w *weather) shift() {
	type day struct{ first, last int }
	perDay := w.perDay
	var days []day
	clear := map[int]float64{}
	for d := 0; d+perDay <= len(w.slots); d += perDay {
		light, extra, whole := 0.0, 0.0, true
		for i := d; i < d+perDay; i++ {
			s := &w.slots[i]
			whole = whole && s.there && finite(s.GHI)
			light += s.GHI
			extra += float64(s.gon * s.sinE)
		}
		if whole && extra > darkWhPerM2*float64(perDay)/24 {
			clear[d] = light / extra
			days = append(days, day{d, d + perDay})
		}
	}
	sort.SliceStable(days, func(i, j int) bool { return clear[days[i].first] > clear[days[j].first] })
	days = days[:len(days)/5]
	if len(days) < 5 {
		return
	}
	air := sun.StandardAir(w.in.ElevationM)
	best := math.Inf(-1)
	for min := -90; min <= 90; min += 5 {
		var n, sx, sy, sxx, syy, sxy float64
		for _, d := range days {
			for i := d.first; i < d.last; i++ {
				s := &w.slots[i]
				p := sun.Where(s.Start.Add(w.in.Step/2+time.Duration(min)*time.Minute), w.in.LatDeg, w.in.LonDeg, air)
				x, y := max(0, sind(p.GeometricDeg)), max(0, s.GHI)
				n++
				sx += x
				sy += y
				sxx += float64(x * x)
				syy += float64(y * y)
				sxy += float64(x * y)
			}
		}
		down := math.Sqrt((float64(n*sxx) - float64(sx*sx)) * (float64(n*syy) - float64(sy*sy)))
		if down <= 0 {
			return
		}
		if r := (float64(n*sxy) - float64(sx*sy)) / down; r > best {
			best, w.report.ShiftMin = r, min
		}
	}
	w.report.ShiftKnown = true
}

// fill brings light and temperature into the slots that have none.
func (w *weather) fill() error {
	n := len(w.slots)
	most := int(shortGap / w.in.Step)
	for i := 0; i < n; i++ {
		if w.slots[i].there {
			continue
		}
		end := i
		for end < n && !w.slots[end].there {
			end++
		}
		if end-i <= most && i > 0 && end < n {
			a, b := &w.slots[i-1], &w.slots[end]
			ka, kb := clearnessOf(a), clearnessOf(b)
			for k := i; k < end; k++ {
				x := float64(k-i+1) / float64(end-i+1)
				w.slots[k].fillWith(ka+float64(x*(kb-ka)), a.TempC+float64(x*(b.TempC-a.TempC)), a.WindMS)
			}
			w.report.FilledShort += end - i
			i = end
			continue
		}
		for k := i; k < end; k++ {
			from, ok := w.sameHour(k, i, end)
			if !ok {
				return &InputError{"Rows", float64(n), "a file in which each hour of the day stands on some day near by"}
			}
			s := &w.slots[from]
			w.slots[k].fillWith(clearnessOf(s), s.TempC, s.WindMS)
		}
		w.report.FilledLong += end - i
		i = end
	}
	return nil
}

// sameHour finds the nearest day whose slot at the hour of k came with the file and lies outside the gap.
func (w *weather) sameHour(k, gapFrom, gapTo int) (int, bool) {
	n := len(w.slots)
	for days := 1; days <= daysPerYear/2; days++ {
		for _, at := range [2]int{k - days*w.perDay, k + days*w.perDay} {
			at = ((at % n) + n) % n
			if w.slots[at].there && (at < gapFrom || at >= gapTo) {
				return at, true
			}
		}
	}
	return 0, false
}

// clearnessOf gives the clearness of a slot, 0 at night.
func clearnessOf(s *slot) float64 {
	ghi := s.GHI
	if !finite(ghi) {
		ghi = s.DHI + float64(s.DNI*s.sinE)
	}
	if top := float64(s.gon * s.sinE); top > 1 {
		return clamp(ghi/top, 0, 1)
	}
	return 0
}

func (s *slot) fillWith(clearness, tempC, windMS float64) {
	s.GHI, s.DHI, s.DNI = float64(clearness*s.gon*s.sinE), math.NaN(), math.NaN()
	s.TempC, s.WindMS = tempC, windMS
}

// sinDiffuseOnly is the sine of 3 degrees, under which all light counts as diffuse.
const sinDiffuseOnly = 0.05233595624294383

// light gives the light of a slot after the tests.
func (w *weather) light(s *slot) light {
	r := &w.report
	ghi, dhi, dni := s.GHI, s.DHI, s.DNI
	below := false
	for _, x := range [3]*float64{&ghi, &dhi, &dni} {
		if *x < 0 {
			*x, below = 0, true
		}
	}
	if below {
		r.Negative++
	}
	if s.top < -1 && max(ghi, 0) > 5 {
		r.AtNight++
	}
	if s.sinE <= 0 {
		return light{}
	}
	mu := math.Pow(s.sinE, 1.2)
	bright := ghi > float64(1.5*s.gon*mu)+100 || dhi > float64(0.95*s.gon*mu)+50 || dni > s.gon
	if bright {
		r.TooBright++
	}
	low := s.sinE < sinElevation15
	known := func(x float64) bool { return finite(x) }
	if !known(ghi) {
		ghi = dhi + float64(dni*s.sinE)
	}
	split := true
	switch {
	case bright:
	case known(dhi) && known(dni) && known(s.GHI):
		closing, diffuse := 0.08, 1.05
		if low {
			closing, diffuse = 0.15, 1.10
		}
		split = ghi > 50 && (math.Abs(ghi/(dhi+float64(dni*s.sinE))-1) > closing || dhi > diffuse*ghi)
		if split {
			r.NotClosing++
		}
	case known(dhi):
		split = false
	case known(dni):
		dhi, split = ghi-float64(dni*s.sinE), false
	}
	if split {
		r.Parted++
		dhi = float64(ghi * w.in.Split.DiffuseShare(ghi/float64(s.gon*s.sinE), s.sinE))
	}
	l := light{ghi: ghi, dhi: clamp(dhi, 0, ghi)}
	if s.sinE < sinDiffuseOnly {
		l.dhi = l.ghi
		return l
	}
	l.dni = (l.ghi - l.dhi) / s.sinE
	if most := float64(beamMostShare * s.gon); l.dni > most {
		r.Bounded++
		l.dni = most
		l.dhi = l.ghi - float64(most*s.sinE)
	}
	return l
}

const sinElevation15 = 0.25881904510252074

// climate puts the moments together.
func (w *weather) climate() *Climate {
	in := w.in
	c := &Climate{in: ClimateInput{LatDeg: in.LatDeg, LonDeg: in.LonDeg, Albedo: in.Albedo}, types: 1}
	c.hours = Hours{step: in.Step, years: w.report.Years, perDay: w.perDay, first: w.first, of: make([]hourOf, len(w.slots))}
	weight := in.Step.Hours() / float64(w.report.Years) / units.WPerKW
	hours := [12]float64{}
	for i := range w.slots {
		s := &w.slots[i]
		c.hours.of[i] = hourOf{row: int32(s.row), year: int16(s.year), filled: !s.there}
		local := s.Start.Add(in.ClockOffset)
		m := int(local.Month()) - 1
		w.report.MeanTempC[m] += s.TempC
		hours[m]++
		l := w.light(s)
		if s.sinE <= 0 || l.ghi <= 0 {
			continue
		}
		wind := -1.0
		if finite(s.WindMS) && s.WindMS >= 0 && in.WindFactor > 0 {
			wind = float64(s.WindMS * in.WindFactor)
		} else {
			w.report.NoWind++
		}
		zenith := math.Acos(clamp(s.sinE, -1, 1))
		c.moments = append(c.moments, moment{
			month: m, hour: local.Hour(), first: len(c.suns), count: w.each, light: len(c.lights),
			sinE: s.sinE, gon: s.gon, zenith: zenith, airMass: sun.AirMass(zenith / radPerDeg),
			airC: s.TempC, windMS: wind, weight: weight,
		})
		c.slots = append(c.slots, int32(i))
		c.lights = append(c.lights, l)
		c.suns = append(c.suns, w.all[i*w.each:(i+1)*w.each]...)
	}
	for m := range hours {
		w.report.MeanTempC[m] /= max(1, hours[m])
		c.in.TempC[m] = w.report.MeanTempC[m]
	}
	c.sum(c.moments)
	return c
}
