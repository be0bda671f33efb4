package run

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/formats/gridfile"
	"groundtally/geo/raster"
	"groundtally/scoring/solar"
	"groundtally/scoring/sun"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// resourceGrid is a grid of wind or sun with its values at the middles of the sites.
type resourceGrid struct {
	rec    study.LayerRecord
	use    study.GridUse
	unread string // why it is not read; empty when it is
	gridSample
}

// gridSample is what a grid says at the middle of each site.
type gridSample struct {
	CellM  float64     // the longer side of a cell at the centre of the frame; 0 where the grid's system does not reach
	States []gridState // by site
	Values []float64   // by site, in the unit of the file; 0 without a value
}

type gridState uint8

const (
	gridOutside gridState = iota
	gridVoid
	gridKnown
)

// gridStep is the step under which samples of grids are kept, so that an edit does not decode every grid anew.
const (
	gridStep    = "grid"
	gridEdition = 1
)

// readGrids samples the grids of wind and sun at the middle of every site.
func (w *world) readGrids(ctx context.Context, cache Cache) error {
	if len(w.grids) == 0 {
		return nil
	}
	at := make([]geo.XY, len(w.sites))
	points := newKey("middles", 1)
	for i, s := range w.sites {
		at[i] = middle(s).Parts[0][0][0]
		points.num(at[i].X)
		points.num(at[i].Y)
	}
	where := points.of(w.frame.Centre().Lon, w.frame.Centre().Lat)
	for _, g := range w.grids {
		var err error
		if g.use, err = study.GridUseOf(g.rec); err != nil {
			g.unread = err.Error()
			continue
		}
		k := newKey(gridStep, gridEdition)
		k.text(g.rec.Digest)
		k.text(g.rec.CRS)
		k.text(where)
		key := k.sum()
		w.gridKeys = append(w.gridKeys, key)
		if err := g.fetch(ctx, w, cache, key, at); err != nil {
			return fmt.Errorf("read layer %q: %w", g.rec.Name, err)
		}
	}
	return nil
}

// fetch takes the kept sample, or decodes the grid and keeps its sample.
func (g *resourceGrid) fetch(ctx context.Context, w *world, cache Cache, key string, at []geo.XY) error {
	if cache != nil {
		have, err := cache.Results(ctx, gridStep, []string{key})
		if err != nil {
			return err
		}
		if data, ok := have[key]; ok {
			return unpack(data, &g.gridSample)
		}
	}
	v, err := w.load(ctx, g.rec.Digest)
	if err != nil {
		return err
	}
	raw, _, _, err := gridfile.Decode(ctx, v.Media, g.rec.File, v.Blob)
	if err != nil {
		return err
	}
	t, err := crs.NewTransform(g.rec.CRS)
	if err != nil {
		return err
	}
	if g.gridSample, err = sampleGrid(raw, t, w.frame, at); err != nil || cache == nil {
		return err
	}
	data, err := pack(g.gridSample)
	if err != nil {
		return err
	}
	return cache.PutResults(ctx, []study.Result{{Step: gridStep, Digest: key, Data: data}}, nil)
}

// sampleGrid gives the values of a grid at places of the frame.
func sampleGrid(raw *raster.Grid, t *crs.Transform, f crs.Frame, at []geo.XY) (gridSample, error) {
	out := gridSample{States: make([]gridState, len(at)), Values: make([]float64, len(at))}
	for i, p := range at {
		ll, err := f.Inverse(p)
		if err != nil {
			return out, err
		}
		x, y, err := t.Inverse(ll)
		if err != nil {
			continue // a place that the grid's system does not reach is outside the grid
		}
		out.Values[i], out.States[i] = gridValue(raw, x, y)
	}
	if x, y, err := t.Inverse(f.Centre()); err == nil {
		for _, side := range [2][2]float64{{raw.CellX, 0}, {0, raw.CellY}} {
			if ll, err := t.Forward(x+side[0], y+side[1]); err == nil {
				if xy, err := f.Forward(ll); err == nil {
					out.CellM = math.Max(out.CellM, xy.Dist(geo.XY{}))
				}
			}
		}
	}
	return out, nil
}

// gridValue gives the value of a grid at a place in its own system, between the centres of the four cells around it.
// In the outer half cell the outermost centres hold on. It is a void where a centre that has weight has no value.
//
//	n = z₀₀ + u(z₁₀ − z₀₀),  s = z₀₁ + u(z₁₁ − z₀₁),  z = n + v(s − n)
//
// with u, v the way from the north-western centre to east and south in cells, 0 to 1. In this form a constant grid gives its constant
// to the last digit.
func gridValue(g *raster.Grid, x, y float64) (float64, gridState) {
	c, r := (x-g.XLL)/g.CellX-0.5, float64(g.NRows)-(y-g.YLL)/g.CellY-0.5
	if !(c >= -0.5 && r >= -0.5 && c <= float64(g.NCols)-0.5 && r <= float64(g.NRows)-0.5) {
		return 0, gridOutside
	}
	c, r = math.Max(0, math.Min(c, float64(g.NCols-1))), math.Max(0, math.Min(r, float64(g.NRows-1)))
	west, north := int(c), int(r)
	u, down := c-float64(west), r-float64(north)
	row := func(r int) (float64, bool) {
		a, ok := g.At(west, r)
		if !ok || u == 0 {
			return decimal(a), ok
		}
		b, ok := g.At(west+1, r)
		return decimal(a) + float64(u*(decimal(b)-decimal(a))), ok
	}
	n, ok := row(north)
	if !ok {
		return 0, gridVoid
	}
	if down == 0 {
		return n, gridKnown
	}
	s, ok := row(north + 1)
	if !ok {
		return 0, gridVoid
	}
	return n + float64(down*(s-n)), gridKnown
}

// decimal gives the shortest decimal number that a cell can stand for: files hold 6.7, and a cell of four bytes
// would make 6.69999981 of it.
func decimal(v float32) float64 {
	x, err := strconv.ParseFloat(strconv.FormatFloat(float64(v), 'g', -1, 32), 64)
	if err != nil {
		return float64(v) // a number is always written in a form that can be read
	}
	return x
}

// words names the grid for a source.
func (g *resourceGrid) words() string {
	of := fmt.Sprintf("%g m above ground", g.use.HeightM)
	if g.use.Month > 0 {
		of = time.Month(g.use.Month).String()
	}
	if g.unread != "" {
		return fmt.Sprintf("grid %q", g.rec.Name)
	}
	return fmt.Sprintf("grid %q (%s, %s, cells of %.0f m)", g.rec.Name, g.use.Field, of, g.CellM)
}

// gridsOf gives the grids of a role, in the order of their names, and the words on those that are not read.
func (w *world) gridsOf(role string) (list []*resourceGrid, unread string) {
	for _, g := range w.grids {
		switch {
		case g.rec.Role != role:
		case g.unread != "":
			unread += fmt.Sprintf("; the grid %q is not read: %s", g.rec.Name, g.unread)
		default:
			list = append(list, g)
		}
	}
	return list, unread
}

// found is what the grids of one field, at one height or in one month, say of a site.
type found struct {
	g     *resourceGrid // that has the value; else the first that covers the site, or the first of all; nil without any
	x     float64       // in the role's unit
	state gridState
}

// look asks the grids for which keep holds; the first with a value serves.
func look(list []*resourceGrid, s site, keep func(study.GridUse) bool) (found, error) {
	var out found
	for _, g := range list {
		if !keep(g.use) {
			continue
		}
		state := g.States[s.index]
		if out.g == nil || state > out.state {
			out.g, out.state = g, state
		}
		if state == gridKnown {
			x, err := g.converted(g.Values[s.index])
			if err != nil {
				return out, fmt.Errorf("layer %q: %w", g.rec.Name, err)
			}
			out.x = x
			return out, nil
		}
	}
	return out, nil
}

// converted brings a value to the role's unit; sums of a day become those of the grid's month.
func (g *resourceGrid) converted(x float64) (float64, error) {
	switch g.use.Field {
	case "mean_speed", "weibull_a":
		return units.Convert(x, unitOr(g.use.Unit, "m/s"), "m/s")
	case "ghi", "dhi":
		unit, daily := g.use.PerMonth()
		if daily {
			x *= float64(sun.DaysInMonth(time.Month(g.use.Month)))
		}
		return units.Convert(x, unitOr(unit, sunUnit), sunUnit)
	}
	return x, nil
}

const sunUnit = "kWh/(m2 month)"

func (f found) void() string {
	return fmt.Sprintf("the %s has no value at the site; it is not filled from elsewhere", f.g.words())
}

// windHere is the wind that serves a site.
type windHere struct {
	windPoint
	distM  float64 // to the resource point; the size of a cell where a grid serves; below 0 where the place is not said
	used   int     // points that have a say
	known  bool
	grid   bool
	hours  *windHours // it comes from, else nil
	why    string     // the wind is not known
	source string     // for people; empty where the study has no grids of wind
	wind   wind.Site  // as the wind engine takes it, but for the height of the ground
}

// windAt gives the wind that serves a part of an option on a site, with what carries it to hub height.
func (f *fitter) windAt(o option, s site) (windHere, error) {
	out, err := f.windFrom(o, s)
	if err != nil || !out.known {
		return out, err
	}
	hub, _ := o.num("hub_height_m")
	return f.withShear(out, hub, s)
}

// windFrom finds the wind for a part of an option on a site: of the grids that cover the site, the one at the height
// nearest to the hub; without such a grid the points around, the hours, or the typed speed. A void of a grid is unknown.
// The hours go before all where the study says so.
func (f *fitter) windFrom(o option, s site) (windHere, error) {
	grids, unread := f.w.gridsOf("wind_resource")
	if f.hoursFirst() {
		return f.windFromHours(s)
	}
	var voids, outside string
	hub, _ := o.num("hub_height_m")
	var best windHere
	tried := map[float64]bool{}
	for _, at := range grids {
		h := at.use.HeightM
		if tried[h] {
			continue
		}
		tried[h] = true
		var here [3]found
		for i, field := range []string{"weibull_a", "weibull_k", "mean_speed"} {
			var err error
			if here[i], err = look(grids, s, func(u study.GridUse) bool { return u.Field == field && u.HeightM == h }); err != nil {
				return windHere{}, err
			}
		}
		a, k, mean := here[0], here[1], here[2]
		p := windHere{windPoint: windPoint{heightM: h}, known: true, grid: true}
		var wb wind.Weibull
		var err error
		switch {
		case a.state == gridKnown && k.state == gridKnown:
			wb = wind.Weibull{AMPerS: a.x, K: k.x}
			err = wb.Check()
			p.source, p.distM = fmt.Sprintf("%s and %s, an even spread of directions assumed", a.g.words(), k.g.words()), math.Max(a.g.CellM, k.g.CellM)
		case mean.state == gridKnown:
			wb, err = wind.Rayleigh(mean.x)
			p.source, p.distM, p.typed = mean.g.words(), mean.g.CellM, true
		default:
			for _, x := range here {
				switch {
				case x.g == nil:
				case x.state == gridVoid:
					voids = cmp.Or(voids, x.void())
				case x.state == gridOutside:
					outside = cmp.Or(outside, fmt.Sprintf("the site lies outside the %s", x.g.words()))
				default:
					outside = cmp.Or(outside, fmt.Sprintf("the %s cannot serve alone: Weibull A and k of one height are needed", x.g.words()))
				}
			}
			continue
		}
		if err != nil {
			voids = cmp.Or(voids, fmt.Sprintf("what stands at the site in the %s is no wind: %v", p.source, err))
			continue
		}
		p.sectors = evenSectors(wb)
		if d, was := math.Abs(h-hub), math.Abs(best.heightM-hub); !best.known || d < was || d == was && h < best.heightM {
			best = p
		}
	}
	switch {
	case best.known:
		best.source = "wind yield from the " + best.source + unread
		return best, nil
	case voids != "":
		return windHere{why: voids}, nil
	}
	var out windHere
	out.windPoint, out.distM, out.used = f.windNear(s.box.Centre())
	out.known = out.used > 0
	if f.blowing != nil && (!out.known || out.id == typedWind) {
		if f.blowing.why == "" {
			return f.windFromHours(s)
		}
		unread += fmt.Sprintf("; the hours of %s are not read for wind: %s", f.blowing.rec.Name, f.blowing.why)
	}
	apart := trimmed(outside + unread)
	switch {
	case !out.known:
		out.why = cmp.Or(apart, "no_layer:wind_resource")
	case out.id != typedWind:
		out.source = strings.TrimSuffix(out.served(out.distM, out.used)+"; "+apart, "; ")
	case apart != "":
		out.source = "wind yield from the typed mean speed; " + apart
	}
	return out, nil
}

// hoursFirst reports whether the study takes the wind of its hours although it has others.
func (f *fitter) hoursFirst() bool {
	v, _, _ := f.w.snap.Lookup("wind.source")
	return v.Value == "hours" && f.blowing != nil && f.blowing.why == ""
}

// trimmed takes the sign before the first of several notes away.
func trimmed(notes string) string { return strings.TrimPrefix(notes, "; ") }

// sunHere is the sunlight that serves a site.
type sunHere struct {
	*sunlight // nil where it is not known
	grid      bool
	hours     *weatherFile // it comes from, else nil
	why       string       // it is not known
	source    string       // for people; empty where the study has no grids of sunlight
}

// sunAt finds the sunlight of a site: grids where they cover it in all months, else the table or the typed values.
// Temperatures come from grids too, else from the table or the typed values.
//
// Hours go before all of these: they tell more, of one place.
func (f *fitter) sunAt(s site) (sunHere, error) {
	grids, unread := f.w.gridsOf("solar_resource")
	if h := f.hours; h != nil {
		if h.climate != nil {
			aside := ""
			if len(grids) > 0 || f.sun != nil || len(f.points) > 0 {
				aside = "; the monthly sunlight of the study stands aside"
			}
			hourly := *f.hourly
			if monthly, _ := f.monthly(s); monthly != nil { // what it says of snow and dirt holds all the same
				hourly.snow, hourly.soiling = monthly.snow, monthly.soiling
			}
			if hourly.tellsLosses() {
				aside = "; of the monthly sunlight only snow and dirt are taken"
			}
			return sunHere{sunlight: &hourly, hours: h, source: "solar yield from " + h.words() + aside}, nil
		}
		unread += fmt.Sprintf("; the hours of %s are not read: %s", h.rec.Name, h.why)
	}
	fallback := func(note string) sunHere {
		sun, from := f.monthly(s)
		out := sunHere{sunlight: sun}
		if f.sunWhy != "" {
			note += "; the monthly sunlight is not read: " + f.sunWhy
		}
		note = trimmed(note + unread)
		switch {
		case sun == nil && note != "":
			out.why = note
		case sun == nil:
			out.why = "no_layer:" + sunRole
		case from != "" || note != "":
			out.source = "solar yield from " + trimmed(cmp.Or(from, sun.source)+"; "+note)
			out.source = strings.TrimSuffix(out.source, "; ")
		}
		return out
	}
	of := func(field string) (x [12]float64, by [12]found, all bool, err error) {
		all = true
		for m := range 12 {
			if by[m], err = look(grids, s, func(u study.GridUse) bool { return u.Field == field && u.Month == m+1 }); err != nil {
				return
			}
			x[m] = by[m].x
			if steps := map[string]float64{"ghi": sunSteps, "dhi": sunSteps, "temperature": tempSteps}[field]; steps > 0 {
				x[m] = math.Round(x[m]*steps) / steps
			}
			all = all && by[m].state == gridKnown
		}
		return
	}
	ghi, by, all, err := of("ghi")
	if err != nil {
		return sunHere{}, err
	}
	some := false
	for m := range by {
		if by[m].g == nil {
			note := ""
			if len(grids) > 0 {
				note = fmt.Sprintf("; the grids of sunlight are not read, because none is of %s", time.Month(m+1))
			}
			return fallback(note), nil
		}
		some = some || by[m].state != gridOutside
	}
	if !some {
		return fallback(fmt.Sprintf("; the site lies outside the %s", by[0].g.words())), nil
	}
	if !all {
		for m := range by {
			switch by[m].state {
			case gridVoid:
				return sunHere{why: by[m].void()}, nil
			case gridOutside:
				return sunHere{why: fmt.Sprintf("the site lies outside the %s, and inside that of another month", by[m].g.words())}, nil
			}
		}
	}
	beside, besideFrom := f.monthly(s)
	losses := sunlight{snow: unsaid, soiling: unsaid}
	if beside != nil { // what a table or points say of snow and dirt holds beside grids
		losses = *beside
	}
	out := &sunlight{snow: losses.snow, soiling: losses.soiling, ghi: ghi, albedo: solar.EveryMonth(defaultAlbedo), source: by[0].g.words() + " and those of the other months"}
	source := "solar yield from the " + out.source
	dhi, _, all, err := of("dhi")
	if err != nil {
		return sunHere{}, err
	}
	if all {
		out.dhi = &dhi
		source += ", with the diffuse part from grids"
	}
	albedo, alb, _, err := of("albedo")
	if err != nil {
		return sunHere{}, err
	}
	for m := range alb {
		if alb[m].state == gridKnown {
			out.albedo[m] = albedo[m]
		}
	}
	temp, t, all, err := of("temperature")
	if err != nil {
		return sunHere{}, err
	}
	for m := range t {
		if t[m].state == gridVoid {
			return sunHere{why: t[m].void()}, nil
		}
	}
	switch {
	case all:
		out.temp = temp
		source += fmt.Sprintf(", temperatures from the %s and those of the other months", t[0].g.words())
	case beside != nil:
		out.temp = beside.temp
		source += ", temperatures from " + cmp.Or(besideFrom, beside.source)
	case f.temps != nil:
		out.temp = f.temps.temp
		source += ", temperatures from " + f.temps.source
	default:
		return sunHere{why: "the grids of sunlight have no temperatures beside them for this site; add grids of them, or type them"}, nil
	}
	return sunHere{sunlight: out, grid: true, source: source + unread}, nil
}

// defaultAlbedo is the share of light that the ground throws back where nothing says otherwise (grass, Liu & Jordan
// 1963).
const defaultAlbedo = 0.2

// sunlight writes a year of sunlight.
func (k *keyer) sunlight(s *sunlight) {
	for i := range 12 {
		k.num(s.ghi[i])
		k.num(s.temp[i])
		k.num(s.albedo[i])
		if s.dhi != nil {
			k.num(s.dhi[i])
		}
		k.num(s.snow[i])
		k.num(s.soiling[i])
	}
}
