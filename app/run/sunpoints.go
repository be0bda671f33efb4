package run

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
)

// sunRole is the role of monthly sunlight.
const sunRole = "solar_resource"

// unsaid is a year of which nothing is said.
var unsaid = solar.EveryMonth(math.NaN())

// monthsOf reads twelve rows of monthly sunlight. An error continues a sentence that names the layer.
func monthsOf(t *geo.Layer, rec study.LayerRecord, rows []geo.Feature) (*sunlight, error) {
	col := func(field string) int {
		if rec.Match[field] == "" {
			return -1
		}
		return t.ColumnIndex(rec.Match[field])
	}
	month, ghi, dhi := col("month"), col("ghi"), col("dhi")
	if month < 0 || ghi < 0 {
		return nil, fmt.Errorf(" needs the fields month and ghi")
	}
	s := &sunlight{source: rec.Name, albedo: solar.EveryMonth(defaultAlbedo), temp: unsaid, snow: unsaid, soiling: unsaid}
	others := []struct {
		at int
		to *[12]float64
	}{{col("temperature"), &s.temp}, {col("albedo"), &s.albedo}, {col("snow_loss"), &s.snow}, {col("soiling_loss"), &s.soiling}}
	var diffuse [12]float64
	var seen [12]bool
	hasDHI := dhi >= 0
	light := func(f *geo.Feature, at int, field string) (x float64, ok bool, err error) {
		if x, ok = f.Values[at].Float(); !ok {
			return 0, false, nil
		}
		x, err = units.Convert(x, unitOr(rec.Units[rec.Match[field]], sunUnit), sunUnit)
		return x, true, err
	}
	for n := range rows {
		f := &rows[n]
		m, ok := f.Values[month].Float()
		i := int(m) - 1
		if !ok || i < 0 || i > 11 || seen[i] {
			return nil, fmt.Errorf(", row %s: month %q is not one of 1 to 12, or stands twice", f.ID, f.Values[month].String())
		}
		seen[i] = true
		x, ok, err := light(f, ghi, "ghi")
		switch {
		case err != nil:
			return nil, fmt.Errorf(": %w", err)
		case !ok:
			return nil, fmt.Errorf(", month %d: no sunlight", i+1)
		}
		s.ghi[i] = x
		if hasDHI {
			if diffuse[i], hasDHI, err = light(f, dhi, "dhi"); err != nil {
				return nil, fmt.Errorf(": %w", err)
			}
		}
		for _, o := range others {
			if o.at < 0 {
				continue
			}
			if x, ok := f.Values[o.at].Float(); ok {
				o.to[i] = x
			}
		}
	}
	for i := range 12 {
		switch {
		case !seen[i]:
			return nil, fmt.Errorf(" has no month %d", i+1)
		case math.IsNaN(s.temp[i]):
			return nil, fmt.Errorf(", month %d: no temperature; the cells' loss by heat needs it", i+1)
		}
		for _, loss := range []float64{s.snow[i], s.soiling[i]} {
			if loss < 0 || loss > 1 {
				return nil, fmt.Errorf(", month %d: a loss of %g is not from 0 to 1", i+1, loss)
			}
		}
	}
	if hasDHI {
		s.dhi = &diffuse
	}
	return s, nil
}

// sunPoint is monthly sunlight at a place.
type sunPoint struct {
	at geo.XY
	*sunlight
}

// sunPoints reads the layers of monthly sunlight at points: twelve rows at each.
func (w *world) sunPoints() ([]sunPoint, error) {
	var out []sunPoint
	for _, l := range w.byRole[sunRole] {
		rows := map[geo.XY][]geo.Feature{}
		var order []geo.XY
		for i, g := range l.xy {
			if g.Kind != geo.Points || g.Empty() {
				continue
			}
			p := g.Parts[0][0][0]
			if _, met := rows[p]; !met {
				order = append(order, p)
			}
			rows[p] = append(rows[p], l.src.Features[i])
		}
		for _, p := range order {
			s, err := monthsOf(l.src, l.rec, rows[p])
			if err != nil {
				ll, ferr := w.frame.Inverse(p)
				if ferr != nil {
					return nil, ferr
				}
				return nil, fmt.Errorf("layer %q, point at %.4f, %.4f%w", l.rec.Name, ll.Lat, ll.Lon, err)
			}
			out = append(out, sunPoint{p, s})
		}
	}
	return out, nil
}

// Sunlight between points. Source: D. Shepard, A two-dimensional interpolation function for irregularly-spaced
// data, 1968, for the weights; the other numbers are assumptions of this program.
const (
	mostSunPoints = 4    // that have a say at a place
	sunLatticeM   = 1000 // sites of one square share their sunlight
	sunSteps      = 5    // of a kWh/(m2 month) to which it is rounded, so that neighbours share a year
	tempSteps     = 10   // of a kelvin
)

// sunNode is the square of the lattice that a place belongs to, by its middle.
func sunNode(p geo.XY) geo.XY {
	return geo.XY{X: math.Round(p.X/sunLatticeM) * sunLatticeM, Y: math.Round(p.Y/sunLatticeM) * sunLatticeM}
}

// betweenPoints is sunlight from several points.
type betweenPoints struct {
	*sunlight
	used int
}

// between gives the sunlight at a node from the nearest points, each weighted by the inverse square of its distance.
// Of snow and dirt those points have a say that tell of them.
func between(points []sunPoint, node geo.XY) betweenPoints {
	near := slices.Clone(points)
	slices.SortStableFunc(near, func(a, b sunPoint) int { return cmp.Compare(a.at.Dist(node), b.at.Dist(node)) })
	near = near[:min(len(near), mostSunPoints)]
	if len(near) == 1 {
		return betweenPoints{near[0].sunlight, 1}
	}
	weights := make([]float64, len(near))
	var sources []string
	for i, q := range near {
		weights[i] = 1 / math.Max(1, float64(q.at.Dist(node)*q.at.Dist(node)))
		if !slices.Contains(sources, q.source) {
			sources = append(sources, q.source)
		}
	}
	mean := func(of func(*sunlight) *[12]float64, steps float64) (out [12]float64) {
		for m := range out {
			total := 0.0
			for i, q := range near {
				if x := of(q.sunlight)[m]; !math.IsNaN(x) {
					out[m] += float64(weights[i] * x)
					total += weights[i]
				}
			}
			out[m] = math.Round(out[m]/total*steps) / steps // not a number where none tells
		}
		return out
	}
	s := &sunlight{
		ghi:    mean(func(s *sunlight) *[12]float64 { return &s.ghi }, sunSteps),
		temp:   mean(func(s *sunlight) *[12]float64 { return &s.temp }, tempSteps),
		albedo: mean(func(s *sunlight) *[12]float64 { return &s.albedo }, 100),
		snow:   mean(func(s *sunlight) *[12]float64 { return &s.snow }, 1000), soiling: mean(func(s *sunlight) *[12]float64 { return &s.soiling }, 1000),
		source: strings.Join(sources, " and "),
	}
	if !slices.ContainsFunc(near, func(q sunPoint) bool { return q.dhi == nil }) {
		d := mean(func(s *sunlight) *[12]float64 { return s.dhi }, sunSteps)
		for m := range d {
			d[m] = math.Min(d[m], s.ghi[m])
		}
		s.dhi = &d
	}
	return betweenPoints{s, len(near)}
}

// monthly gives the monthly sunlight of a site where no grid serves: that of points, else of the table or the typed
// values; nil without any. Source is empty for the last two.
func (f *fitter) monthly(s site) (sun *sunlight, source string) {
	if len(f.points) == 0 {
		return f.sun, ""
	}
	at := s.box.Centre()
	node := sunNode(at)
	f.mu.Lock()
	b, done := f.nodes[node]
	f.mu.Unlock()
	if !done {
		b = between(f.points, node)
		f.mu.Lock()
		f.nodes[node] = b
		f.mu.Unlock()
	}
	m := math.Inf(1)
	for _, q := range f.points {
		m = math.Min(m, q.at.Dist(at))
	}
	from := fmt.Sprintf("the point of %s", b.source)
	if b.used > 1 {
		from = fmt.Sprintf("%d points of %s, weighted by the inverse square of their distances", b.used, b.source)
	}
	return b.sunlight, fmt.Sprintf("%s; the nearest lies %.1f km off", from, m/units.MPerKm)
}

// tellsLosses reports whether anything is said of snow or dirt.
func (s *sunlight) tellsLosses() bool {
	for m := range 12 {
		if !math.IsNaN(s.snow[m]) || !math.IsNaN(s.soiling[m]) {
			return true
		}
	}
	return false
}

// monthlyLosses gives the shares that dirt and snow take, month by month: typed, else of the sunlight's own columns,
// else as shipped, without snow.
func (f *fitter) monthlyLosses(sun *sunlight, l *solar.Losses) {
	for _, loss := range []struct {
		key  string
		said [12]float64
		to   *[12]float64
	}{{"soiling", sun.soiling, &l.SoilingFrac}, {"snow", sun.snow, &l.SnowFrac}} {
		for m := range 12 {
			if x, ok := f.w.snap.Number(fmt.Sprintf("solar.%s_%d_frac", loss.key, m+1)); ok {
				loss.to[m] = x
			} else if !math.IsNaN(loss.said[m]) {
				loss.to[m] = loss.said[m]
			}
		}
	}
}

// sunMatters begin the settings that a plant's sunlight is reckoned with.
var sunMatters = []string{"solar.", "weather.data_kind"}

// sunSettings digests the settings that a fit reads of sunlight.
func sunSettings(snap *study.Snapshot) string {
	k := newKey("settings of sunlight", 1)
	for _, key := range snap.Keys() {
		if !slices.ContainsFunc(sunMatters, func(begin string) bool { return strings.HasPrefix(key, begin) }) {
			continue
		}
		if s, _, ok := snap.Lookup(key); ok {
			k.text(key)
			k.text(s.Value)
		}
	}
	return k.sum()
}

// sunSources are the kinds of sunlight by the words of the settings.
var sunSources = map[string]solar.SunlightSource{"station": solar.FromStation, "satellite": solar.FromSatellite, "map": solar.FromMap}

// steepDeg is the tilt from which on a model of the sky is less sure.
const steepDeg = 45

// dataKind gives the setting that says where the sunlight was taken from.
func (here sunHere) dataKind() string {
	if here.hours != nil {
		return "weather.data_kind"
	}
	return "solar.data_kind"
}

// doubts tells the spread of a yield by its causes.
func (f *fitter) doubts(o option, here sunHere, y solar.YearResult) (*Doubt, error) {
	by, err := f.doubt(o, here, y)
	if err != nil {
		return nil, err
	}
	s, err := f.w.p.Solar.Sigmas(by)
	if err != nil {
		return nil, err
	}
	_, said := f.w.snap.Explicit[here.dataKind()]
	return &Doubt{Source: by.Source.String(), Said: said, Components: s.Components(), BetweenYears: s.BetweenYears, LongTerm: s.Total(0), OneYear: s.Total(1)}, nil
}

// doubt says what the spread of a plant's energy depends on.
func (f *fitter) doubt(o option, here sunHere, y solar.YearResult) (solar.Doubt, error) {
	kind, _, _ := f.w.snap.Lookup(here.dataKind())
	tilt, err := f.tiltDeg(o)
	if err != nil {
		return solar.Doubt{}, err
	}
	d := solar.Doubt{Source: sunSources[kind.Value], Hourly: here.hours != nil, Steep: o.technology == "solar_vertical" || o.technology != "solar_tracking" && tilt > steepDeg}
	for _, st := range y.Chain {
		d.Hilly = d.Hilly || st.Name == solar.StepHorizon && -st.Share > solar.HillyShare
	}
	return d, nil
}
