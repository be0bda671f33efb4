package run

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring/solar"
	"groundtally/scoring/units"
	"groundtally/scoring/wind"
)

// windPoint is the wind of one resource point.
type windPoint struct {
	at      geo.XY
	id      string
	layer   string
	heightM float64
	sectors []wind.Sector
	typed   bool // one mean speed, even spread of directions, Rayleigh
}

// windPoints reads the resource layers, else the typed mean speed.
func (w *world) windPoints() ([]windPoint, error) {
	var out []windPoint
	for _, l := range w.byRole["wind_resource"] {
		type row struct {
			from, share float64
			w           wind.Weibull
		}
		rows := map[geo.XY][]row{}
		height := map[geo.XY]float64{}
		var order []geo.XY
		for i, g := range l.xy {
			if g.Kind != geo.Points || g.Empty() {
				continue
			}
			p := g.Parts[0][0][0]
			h, ok := l.number(i, "height", "m")
			if !ok {
				return nil, fmt.Errorf("layer %q, feature %s has no height", l.rec.Name, l.src.Features[i].ID)
			}
			a, okA := l.number(i, "weibull_a", "m/s")
			k, okK := l.number(i, "weibull_k", "1")
			wb := wind.Weibull{AMPerS: a, K: k}
			if !okA || !okK {
				mean, ok := l.number(i, "mean_speed", "m/s")
				if !ok {
					return nil, fmt.Errorf("layer %q, feature %s has neither Weibull numbers nor a mean speed", l.rec.Name, l.src.Features[i].ID)
				}
				var err error
				if wb, err = wind.Rayleigh(mean); err != nil {
					return nil, fmt.Errorf("layer %q, feature %s: %w", l.rec.Name, l.src.Features[i].ID, err)
				}
			}
			share, ok := l.number(i, "sector_share", "1")
			if !ok {
				share = 1
			}
			from, _ := l.number(i, "sector_from", "deg")
			if _, seen := rows[p]; !seen {
				order = append(order, p)
			}
			rows[p] = append(rows[p], row{from: from, share: share, w: wb})
			height[p] = h
		}
		for _, p := range order {
			rs := rows[p]
			sort.SliceStable(rs, func(i, j int) bool { return rs[i].from < rs[j].from })
			pt := windPoint{at: p, heightM: height[p], id: fmt.Sprintf("%s at %.0f, %.0f", l.rec.Name, p.X, p.Y), layer: l.rec.Name}
			if len(rs) == 1 {
				pt.sectors = evenSectors(rs[0].w)
				pt.typed = true
			} else {
				width := units.DegreesPerCircle / float64(len(rs))
				for i, r := range rs {
					if math.Abs(r.from-rs[0].from-float64(i)*width) > 0.5 || math.Abs(rs[0].from) > 0.5 {
						return nil, fmt.Errorf("layer %q, point at %.0f, %.0f: its sectors are not equal sectors from north (%d rows, one begins at %g degrees)", l.rec.Name, p.X, p.Y, len(rs), r.from)
					}
				}
				for _, r := range rs {
					pt.sectors = append(pt.sectors, wind.Sector{FrequencyFrac: r.share, Weibull: r.w})
				}
			}
			out = append(out, pt)
		}
	}
	if len(out) > 0 {
		return out, nil
	}
	if mean, ok := w.snap.Number("wind.typed_mean_speed_m_per_s"); ok {
		h, ok := w.snap.Number("wind.typed_height_m")
		if !ok {
			return nil, fmt.Errorf("the typed mean speed needs wind.typed_height_m")
		}
		wb, err := wind.Rayleigh(mean)
		if err != nil {
			return nil, fmt.Errorf("wind.typed_mean_speed_m_per_s: %w", err)
		}
		return []windPoint{{id: typedWind, heightM: h, sectors: evenSectors(wb), typed: true}}, nil
	}
	return nil, nil
}

// typedWind names the point that stands for a typed mean speed.
const typedWind = "typed mean speed"

func evenSectors(w wind.Weibull) []wind.Sector {
	const n = 12
	out := make([]wind.Sector, n)
	for i := range out {
		out[i] = wind.Sector{FrequencyFrac: 1.0 / n, Weibull: w}
	}
	return out
}

// prevailingDeg gives the direction from which most energy comes, as the sum of sector vectors weighted
// by frequency × mean cube; even when no 30 degree sector has 15 % of the time.
func prevailingDeg(sectors []wind.Sector) (deg float64, even bool) {
	n := len(sectors)
	x, y, most := 0.0, 0.0, 0.0
	for i, s := range sectors {
		a := units.DegreesPerCircle * float64(i) / float64(n) * math.Pi / 180
		e := s.FrequencyFrac * s.Weibull.Moment(3)
		x += float64(e * math.Sin(a))
		y += float64(e * math.Cos(a))
		most = math.Max(most, s.FrequencyFrac)
	}
	deg = math.Atan2(x, y) * 180 / math.Pi
	if deg < 0 {
		deg += units.DegreesPerCircle
	}
	return deg, most < 0.15
}

// sunlight is a monthly climatology.
type sunlight struct {
	ghi, temp, albedo [12]float64
	dhi               *[12]float64
	snow, soiling     [12]float64 // shares lost to snow and to dirt; not a number where nothing is said
	source            string
}

// sunlight reads the monthly table, else the typed values; nil when there is neither.
func (w *world) sunlight() (*sunlight, error) {
	if t, ok := w.tables[sunRole]; ok {
		var rec study.LayerRecord
		for _, l := range w.snap.LayersOf(sunRole) {
			if l.Kind == "table" {
				rec = l
				break // the one in w.tables
			}
		}
		s, err := monthsOf(t, rec, t.Features)
		if err != nil {
			return nil, fmt.Errorf("layer %q%w", rec.Name, err)
		}
		return s, nil
	}
	if grids, _ := w.gridsOf("solar_resource"); (len(grids) > 0 || len(w.byRole[sunRole]) > 0) && !w.anyTyped("solar.typed_ghi_") {
		return nil, nil // temperatures may be typed beside grids and points of sunlight
	}
	s := &sunlight{source: typedSun, albedo: solar.EveryMonth(defaultAlbedo), snow: unsaid, soiling: unsaid}
	for i := range 12 {
		n := strconv.Itoa(i + 1)
		g, ok := w.snap.Number("solar.typed_ghi_" + n + "_kwh_per_m2")
		if !ok {
			if !w.anyTyped("solar.typed_") {
				return nil, nil
			}
			return nil, fmt.Errorf("typed sunlight: solar.typed_ghi_%d_kwh_per_m2 is missing", i+1)
		}
		t, ok := w.snap.Number("solar.typed_temperature_" + n + "_degc")
		if !ok {
			return nil, fmt.Errorf("typed sunlight: solar.typed_temperature_%d_degc is missing", i+1)
		}
		s.ghi[i], s.temp[i] = g, t
	}
	return s, nil
}

// anyTyped reports whether any value was typed under a beginning of keys.
func (w *world) anyTyped(prefix string) bool {
	for k := range w.snap.Explicit {
		if strings.HasPrefix(k, prefix) {
			return true
		}
	}
	return false
}

const typedSun = "typed monthly values"

// typedTemperatures gives the typed temperatures of all months, for grids of sunlight that have none beside them; nil
// when one is missing.
func (w *world) typedTemperatures() *sunlight {
	s := &sunlight{source: typedSun}
	for i := range 12 {
		t, ok := w.snap.Number(fmt.Sprintf("solar.typed_temperature_%d_degc", i+1))
		if !ok {
			return nil
		}
		s.temp[i] = t
	}
	return s
}

func unitOr(u, fallback string) string {
	if u == "" {
		return fallback
	}
	return u
}

// mount makes the solar plant of an option.
func (w *world) solarPlant(o option, latDeg float64) (solar.Plant, error) {
	get := func(name string, fallback float64) float64 {
		if x, ok := o.num(name); ok {
			return x
		}
		return fallback
	}
	equator := solar.EquatorAzimuthDeg(latDeg)
	m := solar.Mount{TiltDeg: get("tilt_deg", 30), AzimuthDeg: get("azimuth_deg", equator), GCR: get("gcr", 0.45), WidthM: get("collector_width_m", 4), ClearanceM: get("clearance_m", 0.8)}
	switch o.technology {
	case "solar_tracking":
		m.Kind, m.AxisAzimuthDeg, m.MaxAngleDeg, m.Backtrack = solar.SingleAxis, 180, get("rotation_max_deg", 55), true
	case "solar_vertical":
		m.Kind = solar.VerticalRows
		m.AzimuthDeg = get("azimuth_deg", 90)
	case "solar_agri":
		m.Kind = solar.Elevated
	}
	p := w.p.Solar.Plant(m)
	if b := get("bifaciality", 0); b > 0 || m.Kind == solar.VerticalRows {
		mod := w.p.Solar.Module(true)
		if b > 0 {
			mod.Bifaciality = b
		}
		p.Module = mod
	}
	p.Inverter.DCACRatio = get("dc_ac_ratio", 1.2)
	p.Module.ShadeBlocks = int(get("shade_blocks", float64(p.Module.ShadeBlocks)))
	p.Module.GammaPerK = get("module_gamma_per_k", p.Module.GammaPerK)
	l := &p.Losses
	for key, to := range map[string]*float64{"lid": &l.LIDFrac, "nameplate": &l.NameplateFrac, "mismatch": &l.MismatchFrac, "dc_wiring": &l.DCWiringFrac, "ac_wiring": &l.ACWiringFrac, "transformer": &l.TransformerFrac, "auxiliary": &l.AuxiliaryFrac, "availability": &l.AvailabilityFrac} {
		if x, ok := w.snap.Number("solar." + key + "_frac"); ok {
			*to = x
		}
	}
	// What the distribution of the study takes off is reckoned at the connection.
	p.Losses.CurtailmentFrac = 0
	return p, nil
}
