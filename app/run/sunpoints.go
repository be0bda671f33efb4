package run

import (
	"cmp"
	"context"
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

// The temperatures and the sunlight of a month that can be. Source: what the solar engine takes.
const (
	coldestC, warmestC = -80, 60
	mostMonthKWh       = 1000
)

// monthsOf reads twelve rows of monthly sunlight. An error continues a sentence that names the layer, and says how to
// mend it.
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
		field, what  string
		to           *[12]float64
		least, most  float64
		unit, mended string
	}{
		{"temperature", "temperature", &s.temp, coldestC, warmestC, "degC", "if it is in kelvin, give its unit as K"},
		{"albedo", "albedo", &s.albedo, 0, 1, "1", "write a share, as 0.2"},
		{"snow_loss", "loss by snow", &s.snow, 0, 1, "1", "write a share, 0.05 for 5 %"},
		{"soiling_loss", "loss by dirt", &s.soiling, 0, 1, "1", "write a share, 0.05 for 5 %"},
	}
	var diffuse [12]float64
	var seen [12]bool
	hasDHI := dhi >= 0
	number := func(f *geo.Feature, m int, field, what, unit string) (x float64, said bool, err error) {
		v := f.Values[t.ColumnIndex(rec.Match[field])]
		if v.Kind == geo.Null || strings.TrimSpace(v.String()) == "" {
			return 0, false, nil
		}
		x, ok := v.Float()
		if !ok {
			return 0, false, fmt.Errorf(", row %s, month %d: the %s is %q, which is not a number", f.ID, m, what, v.String())
		}
		if u := rec.Units[rec.Match[field]]; u != "" {
			if x, err = units.Convert(x, u, unit); err != nil {
				return 0, false, fmt.Errorf(", column %q: %w", rec.Match[field], err)
			}
		}
		return x, true, nil
	}
	for n := range rows {
		f := &rows[n]
		text := f.Values[month].String()
		m, ok := f.Values[month].Float()
		i := int(m) - 1
		switch {
		case !ok || m != math.Trunc(m) || i < 0 || i > 11:
			return nil, fmt.Errorf(", row %s: %q is no month; write 1 to 12", f.ID, text)
		case seen[i]:
			return nil, fmt.Errorf(", row %s: month %d stands twice; each place has twelve rows, one for a month", f.ID, i+1)
		}
		seen[i] = true
		x, said, err := number(f, i+1, "ghi", "sunlight", sunUnit)
		switch {
		case err != nil:
			return nil, err
		case !said:
			return nil, fmt.Errorf(", row %s, month %d: there is no sunlight", f.ID, i+1)
		case x < 0 || x > mostMonthKWh:
			return nil, fmt.Errorf(", row %s, month %d: sunlight of %g kWh/m2 is not from 0 to %d; check the column and its unit", f.ID, i+1, x, mostMonthKWh)
		}
		s.ghi[i] = x
		if hasDHI {
			if diffuse[i], hasDHI, err = number(f, i+1, "dhi", "diffuse light", sunUnit); err != nil {
				return nil, err
			}
		}
		for _, o := range others {
			if col(o.field) < 0 {
				continue
			}
			x, said, err := number(f, i+1, o.field, o.what, o.unit)
			switch {
			case err != nil:
				return nil, err
			case said && (x < o.least || x > o.most):
				return nil, fmt.Errorf(", row %s, month %d: a %s of %g is not from %g to %g; %s", f.ID, i+1, o.what, x, o.least, o.most, o.mended)
			case said:
				o.to[i] = x
			}
		}
	}
	for i := range 12 {
		switch {
		case !seen[i]:
			return nil, fmt.Errorf(" has no month %d; each place needs twelve rows", i+1)
		case math.IsNaN(s.temp[i]):
			return nil, fmt.Errorf(", month %d: there is no temperature, which the cells' loss by heat needs; add a column of it", i+1)
		}
	}
	if hasDHI {
		s.dhi = &diffuse
	}
	return s, nil
}

// A year of sunlight on level ground lies between these everywhere on land. Source: common practice.
const leastYearKWh, mostYearKWh = 500, 2900

// sunNotices tells which monthly sunlight cannot be read, and which is hardly that of a year.
func sunNotices(ctx context.Context, store study.Store, snap *study.Snapshot) ([]geo.Notice, error) {
	var out []geo.Notice
	for _, rec := range snap.LayersOf(sunRole) {
		if rec.Kind == "raster" {
			continue
		}
		v, _, err := store.Version(ctx, rec.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		places := map[geo.LonLat][]geo.Feature{}
		var order []geo.LonLat
		for _, f := range v.Layer.Features {
			var at geo.LonLat
			if f.Geometry.Kind == geo.Points && !f.Geometry.Empty() {
				at = f.Geometry.Parts[0][0][0]
			}
			if _, met := places[at]; !met {
				order = append(order, at)
			}
			places[at] = append(places[at], f)
		}
		for _, at := range order {
			n := geo.Notice{Severity: geo.Warning, Layer: rec.Name}
			if rec.Kind != "table" {
				n.At = &at
			}
			s, err := monthsOf(v.Layer, rec, places[at])
			if err != nil {
				n.Code, n.Args = "sun_not_read", map[string]string{"why": strings.TrimLeft(err.Error(), ", ")}
				out = append(out, n)
				continue
			}
			year := 0.0
			for _, x := range s.ghi {
				year += x
			}
			if year < leastYearKWh || year > mostYearKWh {
				n.Code, n.Args = "sun_hardly", map[string]string{"year": fmt.Sprintf("%.0f", year)}
				out = append(out, n)
			}
		}
	}
	return out, nil
}

// placeWords writes a place as people read it.
func placeWords(p geo.LonLat) string {
	north, east := "N", "E"
	if p.Lat < 0 {
		north = "S"
	}
	if p.Lon < 0 {
		east = "W"
	}
	return fmt.Sprintf("%.5f %s, %.5f %s", math.Abs(p.Lat), north, math.Abs(p.Lon), east)
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
				return nil, fmt.Errorf("layer %q, point at %s%w", l.rec.Name, placeWords(ll), err)
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
	return settingsOf(snap, "settings of sunlight", sunMatters...)
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
	by, err := f.doubt(o, here, y.Chain)
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
func (f *fitter) doubt(o option, here sunHere, chain []solar.Step) (solar.Doubt, error) {
	kind, _, _ := f.w.snap.Lookup(here.dataKind())
	tilt, err := f.tiltDeg(o)
	if err != nil {
		return solar.Doubt{}, err
	}
	d := solar.Doubt{Source: sunSources[kind.Value], Hourly: here.hours != nil, Steep: o.technology == "solar_vertical" || o.technology != "solar_tracking" && tilt > steepDeg}
	for _, st := range chain {
		d.Hilly = d.Hilly || st.Name == solar.StepHorizon && -st.Share > solar.HillyShare
	}
	return d, nil
}
