package wind

import (
	"errors"
	"fmt"
	"math"
	"sort"
	"time"

	"groundtally/scoring/units"
)

// SeriesHour is one hour of a measured or modelled series.
type SeriesHour struct {
	// Hour counts hours from the start of 1970 by the clock of the series, leap days like any other day.
	Hour       int64
	SpeedMPerS float64 // mean of the hour, 0 to 100
	FromDeg    float64 // wind comes from there, clockwise from north, 0 to 360; used when HasDir
	TempC      float64 // air at the height of the series, -60 to 59; used when HasTemp
	PressurePa float64 // air at the height of the series, not brought to sea level, 30000 to 110000; used when HasPressure
	Valid      bool    // false: the hour is in the series but nothing of it counts
	HasDir     bool
	HasTemp    bool
	// HasPressure needs no HasTemp, nor the other way round: what is not known is the site's.
	HasPressure bool
}

// CalmBelowMPerS is the speed below which an hour counts as calm: about where a cup or a vane stands
// still. Common practice.
const CalmBelowMPerS = 0.5

// SeriesSectors is the number of sectors of the rose that a series gives.
const SeriesSectors = 12

const (
	// minCoverageFrac is the least share of hours in force. Common practice.
	minCoverageFrac = 0.8
	// minSectorHours is the least number of hours for which a sector gets a shape of its own.
	minSectorHours = 50
	// maxSeriesHours bounds the span, a century, so that one wrong date does not take all memory.
	maxSeriesHours = 100 * 8784
	hoursPerDay    = 24
	monthsPerYear  = 12
)

// monthHours are the hours of each month in a year of 8,760.
var monthHours = [monthsPerYear]float64{744, 672, 744, 720, 744, 720, 744, 744, 720, 744, 720, 744}

// ErrSeriesGaps is wrapped when a series has too many gaps to stand for a year.
var ErrSeriesGaps = errors.New("the series has too many gaps")

// FitHow says where a distribution came from.
type FitHow uint8

// The ways to a distribution, each for where the one before gives none.
const (
	FitNone       FitHow = iota // no hours
	FitEnergy                   // keeps the mean cube and the share above the mean
	FitLikelihood               // most likely shape of the hours that are not calm; keeps the mean cube of all hours
	FitShape                    // shape of the whole series with the sector's mean
	FitRayleigh                 // shape 2 with the mean: no shape fits the whole series
)

// SeriesFit is what a series says of the wind at its height.
type SeriesFit struct {
	Hours        int     // rows given
	ValidHours   int     // of them in force
	SpannedHours int     // from the first row to the last
	CoverageFrac float64 // hours in force per hours spanned
	// MissingMonths lists the months of the calendar (1 to 12) of which no year has an hour in force.
	MissingMonths  []int
	Gaps           bool    // coverage below 80 percent, or a month missing
	Usable         bool    // no such gaps, or they were allowed
	CalmFrac       float64 // of the hours in force below CalmBelowMPerS
	MeanMPerS      float64 // of all hours in force
	DirectionHours int     // hours in force with a direction

	EnergyPreserving  Weibull // of all hours; zero when there is none
	MaximumLikelihood Weibull // of the hours that are not calm, so it over-states energy by CalmFrac; zero when there is none
	Whole             Weibull // the one to use for all directions together
	WholeHow          FitHow

	Rose        []Sector // SeriesSectors of them, or one when no hour has a direction
	SectorHours []int
	SectorHow   []FitHow
	FellBack    int // sectors with hours whose distribution is not FitEnergy
}

// SeriesOptions choose what is done with a series.
type SeriesOptions struct {
	AllowGaps bool // use the series in spite of ErrSeriesGaps
}

// check reports why an hour cannot be used, or nil.
func (h *SeriesHour) check() error {
	switch {
	case h.Hour > 1e8 || h.Hour < -1e8: // about the years -9400 to 13400
		return fmt.Errorf("hour %d lies outside all calendars", h.Hour)
	case !h.Valid:
		return nil
	case !(h.SpeedMPerS >= 0 && h.SpeedMPerS <= 100):
		return fmt.Errorf("speed %g m/s lies outside 0 to 100", h.SpeedMPerS)
	case h.HasDir && !(h.FromDeg >= 0 && h.FromDeg <= units.DegreesPerCircle):
		return fmt.Errorf("direction %g degrees lies outside 0 to 360", h.FromDeg)
	case h.HasTemp && !(h.TempC >= -60 && h.TempC <= 59):
		return fmt.Errorf("temperature %g degrees Celsius lies outside -60 to 59", h.TempC)
	case h.HasPressure && !(h.PressurePa >= 30000 && h.PressurePa <= 110000):
		return fmt.Errorf("air pressure %g Pa lies outside 30000 to 110000", h.PressurePa)
	}
	return nil
}

// months tells the month of hours; most follow each other, so the last day is remembered.
type months struct {
	day   int64
	month int // 0 to 11
	known bool
}

func (m *months) of(hour int64) int {
	day := hour / hoursPerDay
	if hour%hoursPerDay < 0 {
		day--
	}
	if !m.known || day != m.day {
		m.day, m.known = day, true
		m.month = int(time.Unix(day*hoursPerDay*int64(units.SecondsPerHour), 0).UTC().Month()) - 1
	}
	return m.month
}

// FitSeries judges a series and fits distributions of speed to it, at the height of the series. The rows
// may stand in any order; two of one hour are an error, as are speeds, directions, temperatures and
// pressures outside the ranges of SeriesHour. Coverage counts from the first row to the last, so a row
// that is not valid and a row that is not there weigh alike.
//
// The sectors' distributions keep energy (European Wind Atlas, Troen & Petersen 1989); where that has
// no solution the most likely shape stands in (Stevens & Smulders 1979), and a sector with fewer than
// 50 hours takes the shape of the whole series. Frequencies count the hours that have a direction, calm
// or not.
//
// A series with coverage below 80 percent, or without a single hour of some month of the calendar, is
// refused with ErrSeriesGaps unless that is allowed; the fit comes back with the error, so that the
// gaps can be shown.
func FitSeries(hours []SeriesHour, o SeriesOptions) (SeriesFit, error) {
	s := SeriesFit{Hours: len(hours)}
	if err := s.count(hours); err != nil {
		return s, err
	}
	var missing [monthsPerYear]bool
	for i := range missing {
		missing[i] = true
	}
	var cal months
	all := make([]float64, 0, s.ValidHours)
	bySector := make([][]float64, SeriesSectors)
	for i := range bySector {
		bySector[i] = make([]float64, 0, s.ValidHours/SeriesSectors)
	}
	calm := 0
	for i := range hours {
		h := &hours[i]
		if !h.Valid {
			continue
		}
		missing[cal.of(h.Hour)] = false
		all = append(all, h.SpeedMPerS)
		s.MeanMPerS += h.SpeedMPerS
		if h.SpeedMPerS < CalmBelowMPerS {
			calm++
		}
		if h.HasDir {
			n := sectorOf(h.FromDeg, SeriesSectors)
			bySector[n] = append(bySector[n], h.SpeedMPerS)
			s.DirectionHours++
		}
	}
	for i, none := range missing {
		if none {
			s.MissingMonths = append(s.MissingMonths, i+1)
		}
	}
	s.Gaps = s.CoverageFrac < minCoverageFrac || len(s.MissingMonths) > 0
	s.Usable = !s.Gaps || o.AllowGaps
	s.CalmFrac = float64(calm) / float64(s.ValidHours)
	s.MeanMPerS /= float64(s.ValidHours)
	if err := s.fitWhole(all); err != nil {
		return s, err
	}
	if err := s.fitSectors(bySector); err != nil {
		return s, err
	}
	if !s.Usable {
		return s, s.gaps()
	}
	return s, nil
}

func (s *SeriesFit) gaps() error {
	return fmt.Errorf("%d of %d hours (%.0f percent), months without any: %v: %w", s.ValidHours, s.SpannedHours, 100*s.CoverageFrac, s.MissingMonths, ErrSeriesGaps)
}

// count checks the rows and how much of their span they cover.
func (s *SeriesFit) count(hours []SeriesHour) error {
	if len(hours) == 0 {
		return errors.New("a series without hours")
	}
	lo, hi := hours[0].Hour, hours[0].Hour
	for i := range hours {
		h := &hours[i]
		if err := h.check(); err != nil {
			return fmt.Errorf("row %d of the series: %w", i+1, err)
		}
		lo, hi = min(lo, h.Hour), max(hi, h.Hour)
		if h.Valid {
			s.ValidHours++
		}
	}
	span := hi - lo + 1
	if span > maxSeriesHours {
		return fmt.Errorf("the series spans %d hours; %d are possible", span, maxSeriesHours)
	}
	if s.ValidHours == 0 {
		return errors.New("no hour of the series is valid")
	}
	seen := make([]bool, span)
	for i := range hours {
		at := hours[i].Hour - lo
		if seen[at] {
			return fmt.Errorf("row %d of the series: its hour stands twice", i+1)
		}
		seen[at] = true
	}
	s.SpannedHours = int(span)
	s.CoverageFrac = float64(s.ValidHours) / float64(span)
	return nil
}

// sectorOf is the sector of n, the first centred on north, of a direction from 0 to 360 degrees.
func sectorOf(fromDeg float64, n int) int {
	return int(math.Floor(float64(fromDeg*float64(n))/units.DegreesPerCircle+0.5)) % n
}

// likeliestShape is the most likely shape of the speeds that are not calm.
func likeliestShape(speedsMPerS []float64) (Weibull, bool) {
	windy := make([]float64, 0, len(speedsMPerS))
	for _, v := range speedsMPerS {
		if v >= CalmBelowMPerS {
			windy = append(windy, v)
		}
	}
	w, _, err := FitMaximumLikelihood(windy)
	return w, err == nil
}

// keepingCube gives the distribution of shape k with the mean cube of the speeds.
func keepingCube(speedsMPerS []float64, k float64) Weibull {
	var m3 float64
	for _, v := range speedsMPerS {
		m3 += float64(v * v * v)
	}
	return Weibull{AMPerS: math.Cbrt(m3 / float64(len(speedsMPerS)) / math.Gamma(1+3/k)), K: k}
}

func (s *SeriesFit) fitWhole(all []float64) error {
	if w, err := FitEnergyPreserving(all); err == nil {
		s.EnergyPreserving = w
		s.Whole, s.WholeHow = w, FitEnergy
	}
	if w, ok := likeliestShape(all); ok {
		s.MaximumLikelihood = w
		if s.WholeHow == FitNone {
			s.Whole, s.WholeHow = keepingCube(all, w.K), FitLikelihood
		}
	}
	if s.WholeHow == FitNone {
		w, err := Rayleigh(s.MeanMPerS)
		if err != nil {
			return fmt.Errorf("series: %w", err)
		}
		s.Whole, s.WholeHow = w, FitRayleigh
	}
	return nil
}

func (s *SeriesFit) fitSectors(bySector [][]float64) error {
	if s.DirectionHours == 0 {
		s.Rose, s.SectorHours, s.SectorHow = []Sector{{1, s.Whole}}, []int{s.ValidHours}, []FitHow{s.WholeHow}
		if s.WholeHow != FitEnergy {
			s.FellBack = 1
		}
		return nil
	}
	s.Rose, s.SectorHours, s.SectorHow = make([]Sector, SeriesSectors), make([]int, SeriesSectors), make([]FitHow, SeriesSectors)
	for i, vs := range bySector {
		s.SectorHours[i] = len(vs)
		if len(vs) == 0 {
			continue
		}
		w, how, err := s.fitSector(vs)
		if err != nil {
			return err
		}
		if how != FitEnergy {
			s.FellBack++
		}
		s.Rose[i] = Sector{FrequencyFrac: float64(len(vs)) / float64(s.DirectionHours), Weibull: w}
		s.SectorHow[i] = how
	}
	return nil
}

func (s *SeriesFit) fitSector(vs []float64) (Weibull, FitHow, error) {
	if len(vs) >= minSectorHours {
		if w, err := FitEnergyPreserving(vs); err == nil {
			return w, FitEnergy, nil
		}
		if w, ok := likeliestShape(vs); ok {
			return keepingCube(vs, w.K), FitLikelihood, nil
		}
	}
	var mean float64
	for _, v := range vs {
		mean += v
	}
	// A sector of nothing but zeros still needs a scale; no machine runs in half a calm.
	mean = math.Max(mean/float64(len(vs)), CalmBelowMPerS/2)
	w, err := FromMeanAndK(mean, s.Whole.K)
	return w, FitShape, err
}

// SeriesResult is a farm's year by its series of hours.
type SeriesResult struct {
	// PowerKW is the farm's power in each hour, in the order of the series, behind wakes and before the
	// other losses; 0 where the hour is not valid.
	PowerKW []float64
	// The energies are those of the hours in force, times 8,760 per hours in force.
	GrossMWhPerYr  float64 // free stream
	WakedMWhPerYr  float64 // behind wakes, before the other losses
	NetMWhPerYr    float64
	Chain          []Step // gross to net; the first step is the wake
	WakeLossFrac   float64
	CapacityFactor float64 // of the net energy
	// MonthMWh is each month's mean power behind wakes, before the other losses, times the hours of the
	// month in a year of 8,760; 0 for a month without hours. Where months are covered unevenly their sum
	// is not WakedMWhPerYr.
	MonthMWh        [12]float64
	MonthValidHours [12]int
	CalmFrac        float64
	AirKgPerM3      float64 // mean density at the hub
	DensityHours    int     // hours with a density of their own; the others have the site's
	NoDirHours      int     // hours in force without a direction: they lose what the rose loses on average
	// FitMWhPerYr is WakedMWhPerYr by the rose fitted to the series, and FitYear all of that year: to be
	// shown beside the sum over the hours.
	FitMWhPerYr float64
	FitYear     FarmResult
}

// SeriesYear computes the energy of a farm hour by hour. In.Site.RefHeightM is the height of the series
// (m above ground), In.Site.Rose plays no part; fit is what FitSeries gave for these hours.
//
// Each hour's speed goes to the hub by the site's shear law. The hour's density is that of dry air after
// IEC 61400-12-1 from temperature and pressure; they are carried to the hub by 6.5 K/km and by the
// hypsometric equation, one that is not known is that of the site (standard atmosphere at hub height,
// Site.TempC when known), and with neither the site's density stands. Curves are read as FarmYear does.
// Wakes come from a table of (waked power)/(free power) by direction and normalised speed, computed once
// with the settings' directions and speed nodes, linear between both; an hour without direction has the
// mean of the table over the time of the rose.
//
// Besides the errors of FarmYear and of FitSeries's checks: ErrSeriesGaps when the fit is not usable.
func SeriesYear(in FarmInput, hours []SeriesHour, fit SeriesFit) (SeriesResult, error) {
	if len(hours) != fit.Hours || len(fit.Rose) == 0 {
		return SeriesResult{}, fmt.Errorf("the fit of %d hours does not belong to the series of %d", fit.Hours, len(hours))
	}
	if !fit.Usable {
		return SeriesResult{}, fit.gaps()
	}
	in.Site.Rose = fit.Rose
	tab := wakeTable{}
	first := len(in.Existing)
	year, err := farmYear(in, func(f *field, d int, fl *flow) { tab.take(f, d, fl.ratio[first:]) })
	if err != nil {
		return SeriesResult{}, err
	}
	air, err := newSeriesAir(in)
	if err != nil {
		return SeriesResult{}, err
	}
	toHub, err := in.Site.speedFactor(in.Site.RefHeightM, in.HubHeightM)
	if err != nil {
		return SeriesResult{}, err
	}
	r := SeriesResult{PowerKW: make([]float64, len(hours)), CalmFrac: fit.CalmFrac, FitMWhPerYr: year.Chain[0].AfterMWh, FitYear: year}
	var cal months
	var gross, waked, density float64
	var byMonth [monthsPerYear]float64
	valid := 0
	machines, own := float64(len(in.At)), &tab.f.kinds[0]
	for i := range hours {
		h := &hours[i]
		if err := h.check(); err != nil {
			return SeriesResult{}, fmt.Errorf("row %d of the series: %w", i+1, err)
		}
		if !h.Valid {
			continue
		}
		valid++
		v := h.SpeedMPerS * toHub
		inCurve, factor, rho := v*own.s, own.p, air.site
		if h.HasTemp || h.HasPressure {
			if rho, err = air.density(h); err != nil {
				return SeriesResult{}, fmt.Errorf("row %d of the series: %w", i+1, err)
			}
			r.DensityHours++
			if in.Turbine.Stall {
				factor = rho / ReferenceDensityKgPerM3
			} else {
				inCurve = NormalisedSpeed(v, rho)
			}
		}
		density += rho
		free := machines * factor * in.Turbine.Curve.PowerKW(inCurve)
		month := cal.of(h.Hour)
		r.MonthValidHours[month]++
		left := 0.0
		if !h.HasDir {
			r.NoDirHours++
		}
		if free > 0 {
			left = free * tab.ratio(inCurve/own.s, h.FromDeg, h.HasDir)
		}
		r.PowerKW[i] = left
		gross += free
		waked += left
		byMonth[month] += left
	}
	if valid != fit.ValidHours {
		return SeriesResult{}, fmt.Errorf("the fit of %d hours in force does not belong to a series with %d", fit.ValidHours, valid)
	}
	perYear := mwhPerKWYear / float64(valid)
	r.GrossMWhPerYr, r.WakedMWhPerYr, r.AirKgPerM3 = gross*perYear, waked*perYear, density/float64(valid)
	for m, kw := range byMonth {
		if n := r.MonthValidHours[m]; n > 0 {
			r.MonthMWh[m] = kw / float64(n) * monthHours[m] / units.KWhPerMWh
		}
	}
	if gross > 0 {
		r.WakeLossFrac = math.Max(0, 1-waked/gross)
	}
	losses := append([]Loss{{Name: LossWake, Frac: r.WakeLossFrac}}, in.Losses...)
	if r.Chain, r.NetMWhPerYr, err = Chain(r.GrossMWhPerYr, losses); err != nil {
		return SeriesResult{}, err
	}
	r.CapacityFactor = CapacityFactor(r.NetMWhPerYr, in.Turbine.RatedKW*machines)
	return r, nil
}

// wakeTable is the farm's waked power per free power by direction and speed node.
type wakeTable struct {
	f     *field
	nodes int
	frac  []float64 // direction by direction, node by node
	mean  []float64 // over the time of the rose
}

// take adds a direction: the ratios of the farm's machines, which all have one free power.
func (t *wakeTable) take(f *field, d int, ratios [][]float64) {
	if t.f == nil {
		t.f, t.nodes = f, len(f.nodes)
		t.frac, t.mean = make([]float64, len(f.shares)*t.nodes), make([]float64, t.nodes)
	}
	to := t.frac[d*t.nodes : (d+1)*t.nodes]
	for _, ratio := range ratios {
		for q, x := range ratio {
			to[q] += x
		}
	}
	share := f.timeFrac(d)
	for q := range to {
		to[q] /= float64(len(ratios))
		t.mean[q] += float64(share * to[q])
	}
}

// ratio looks the table up at a free-stream speed at hub height in the site's mean air.
func (t *wakeTable) ratio(vMPerS, fromDeg float64, hasDir bool) float64 {
	ns := t.f.nodes
	q := min(max(sort.SearchFloat64s(ns, vMPerS)-1, 0), t.nodes-2)
	x := math.Max(0, math.Min(1, (vMPerS-ns[q])/(ns[q+1]-ns[q])))
	between := func(row []float64) float64 { return row[q] + float64(x*(row[q+1]-row[q])) }
	if !hasDir {
		return between(t.mean)
	}
	n := len(t.frac) / t.nodes
	at := fromDeg * float64(n) / units.DegreesPerCircle
	d := int(at)
	y := at - float64(d)
	d %= n
	a := between(t.frac[d*t.nodes : (d+1)*t.nodes])
	d = (d + 1) % n
	b := between(t.frac[d*t.nodes : (d+1)*t.nodes])
	return a + float64(y*(b-a))
}

// seriesAir gives the density of an hour at the hub.
type seriesAir struct {
	site     float64 // density, kg/m3
	tempK    float64 // of the site at the hub
	pressure float64 // of the site at the hub, Pa
	riseM    float64 // from the series up to the hub
}

func newSeriesAir(in FarmInput) (seriesAir, error) {
	hM := in.Site.ElevationM + in.HubHeightM
	a, err := StandardAtmosphere(hM)
	if err == nil && in.Site.TempKnown {
		a, err = AtmosphereAt(hM, in.Site.TempC)
	}
	return seriesAir{site: a.DensityKgPerM3, tempK: a.TemperatureK, pressure: a.PressurePa, riseM: in.HubHeightM - in.Site.RefHeightM}, err
}

func (a seriesAir) density(h *SeriesHour) (float64, error) {
	drop := isaLapseKPM * a.riseM
	hub, pressure := a.tempK, a.pressure
	if h.HasTemp {
		hub = h.TempC + units.ZeroCelsiusK - drop
	}
	if h.HasPressure {
		// Gravity per gas constant, K/m, is the exponent of the standard atmosphere times its lapse rate.
		mean := hub + drop/2
		pressure = h.PressurePa * math.Exp(-isaExponent*isaLapseKPM*a.riseM/mean)
	}
	return MoistAirDensity(hub, pressure, 0)
}
