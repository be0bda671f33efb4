package run

import (
	"context"
	"errors"
	"slices"
	"strings"
	"testing"

	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
)

func (p *plain) idle(keys ...string) map[string]geo.Notice {
	p.t.Helper()
	snap, err := p.s.Snapshot()
	if err != nil {
		p.t.Fatal(err)
	}
	list, err := SettingNotices(context.Background(), StoreLoader(p.s.Store()), snap, keys...)
	if err != nil {
		p.t.Fatal(err)
	}
	out := map[string]geo.Notice{}
	for _, n := range list {
		out[n.Field] = n
	}
	return out
}

// Every rule that an option can have is one of those that may be excepted.
func TestRuleNamesAreAllRules(t *testing.T) {
	p := windStudy(t)
	cat := p.s.Catalog()
	p.set("rule.setback.boundary.wind_m", "1")
	for _, r := range cat.Roles {
		if r.Name == "parcels" || r.Name == "district" || r.Name == heightRule || !(r.Accepts("polygon") || r.Accepts("line") || r.Accepts("point")) {
			continue
		}
		p.set("rule.setback."+r.Name+".wind_m", "1", "rule.exclude."+r.Name, "true")
		shape := square(400, 400, 1)
		switch {
		case r.Accepts("polygon"):
		case r.Accepts("line"):
			shape = line(400, 400, 401, 401)
		default:
			shape = geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{{X: 400, Y: 400}}}}}
		}
		var columns []string
		values := map[string]string{}
		for _, f := range r.Fields {
			if f.Required {
				columns, values[f.Name] = append(columns, f.Name), "1"
			}
		}
		p.add(r.Name, columns, thing{shape, values})
	}
	_, rs := p.ground(windPart)
	names := RuleNames(cat)
	if len(rs.rules) < 40 {
		t.Fatalf("only %d rules were made", len(rs.rules))
	}
	for _, r := range rs.rules {
		if !slices.Contains(names, r.name) {
			t.Errorf("rule %s cannot be excepted", r.name)
		}
	}
}

func TestExceptionsOfWhatIsNotThere(t *testing.T) {
	p := newPlain(t)
	cat, params := p.s.Catalog(), shipped(t)
	var value *study.ValueError
	for key, want := range map[string]string{
		"rule.except.setback:dwelling.A": "near it are: setback:dwellings",
		"rule.except.dwellings.A":        "setback:dwellings, exclude:dwellings",
		"rule.except.slop.A":             "near it are: slope",
		"rule.except.exclude:parcels.A":  "the rules are: setback:boundary, slope, aspect, height_limit",
	} {
		if err := CheckSetting(cat, params, key, "yes"); !errors.As(err, &value) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v, want %q", key, err, want)
		}
	}
	for _, key := range []string{"rule.except.setback:dwellings.DE.1", "rule.except.slope.A", "rule.except.height_limit.A", "rule.except.setback:boundary.A"} {
		if err := CheckSetting(cat, params, key, "yes"); err != nil {
			t.Error(err)
		}
	}
	// Without parcels nobody can tell.
	p.set("rule.except.slope.DE.1", "yes")
	if n := p.idle()["rule.except.slope.DE.1"]; n.Code != string(exceptNoParcels) {
		t.Errorf("without parcels: %+v", n)
	}
	p.add("parcels", []string{"parcel_id"}, thing{square(0, 0, 10), map[string]string{"parcel_id": "DE.1"}}, thing{square(20, 0, 10), map[string]string{"parcel_id": "DE.2"}},
		thing{square(40, 0, 10), map[string]string{"parcel_id": "DE.3"}})
	if _, err := p.s.GroupParcels(context.Background(), "pair", []string{"DE.2", "DE.3"}, "test"); err != nil {
		t.Fatal(err)
	}
	snap, err := p.s.Snapshot()
	if err != nil {
		t.Fatal(err)
	}
	load := StoreLoader(p.s.Store())
	for site, want := range map[string]string{"DE.1": "", "pair": "", "DE.2": "part of the site pair", "DE.11": "near it are: DE.1", "elsewhere": `no site "elsewhere" among the 2`} {
		err := CheckException(context.Background(), load, snap, "rule.except.slope."+site)
		if (err == nil) != (want == "") || err != nil && !strings.Contains(err.Error(), want) {
			t.Errorf("site %s: %v, want %q", site, err, want)
		}
	}
	p.set("rule.except.slope.DE.2", "yes", "rule.except.nothing.DE.1", "yes", "rule.except.aspect.gone", "false")
	got := p.idle()
	if n := got["rule.except.slope.DE.1"]; n.Code != string(exceptIdle) {
		t.Errorf("without a slope rule: %+v", n)
	}
	p.set("rule.slope_max.wind_deg", "10")
	p.terrain(func(x, y float64) float64 { return 1 })
	if got = p.idle(); len(got) != 2 || got["rule.except.slope.DE.2"].Code != string(exceptNoSite) || got["rule.except.nothing.DE.1"].Code != string(exceptNoRule) {
		t.Errorf("%+v", got)
	}
	for _, n := range got {
		if text := present.Notice(n); !strings.Contains(text, "the exception has no effect: ") || strings.ContainsAny(text, "{}") {
			t.Errorf("it is said: %s", text)
		}
	}
}

func TestRuleInForce(t *testing.T) {
	p := newPlain(t)
	p.add("parcels", []string{"parcel_id"}, thing{square(0, 0, 10), map[string]string{"parcel_id": "A"}})
	force := func(name string) bool {
		t.Helper()
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		return RuleInForce(snap, name)
	}
	for name, want := range map[string]bool{boundaryRule: true, "setback:roads": false, "exclude:roads": false, "setback:dwellings": false, slopeRule: false, aspectRule: false, heightRule: false} {
		if force(name) != want {
			t.Errorf("%s at the start: %v, want %v", name, !want, want)
		}
	}
	p.add("roads", []string{"class"}, thing{line(0, 0, 10, 0), map[string]string{"class": "x"}})
	p.add("dwellings", []string{"class"}, thing{square(0, 0, 1), map[string]string{"class": "x"}})
	for name, want := range map[string]bool{"setback:roads": true, "exclude:roads": true, "setback:dwellings": false} { // defaults
		if force(name) != want {
			t.Errorf("%s with layers: %v, want %v", name, !want, want)
		}
	}
	p.set("rule.setback.roads.wind_tip", "0", "rule.exclude.roads", "no", "rule.setback.dwellings.class.x.wind_m", "5", "rule.setback.boundary.wind_rotor", "0")
	for name, want := range map[string]bool{"setback:roads": false, "exclude:roads": false, "setback:dwellings": true, boundaryRule: false} {
		if force(name) != want {
			t.Errorf("%s as set: %v, want %v", name, !want, want)
		}
	}
}

func TestSettingsThatNothingFallsUnder(t *testing.T) {
	p := windStudy(t)
	p.add("roads", []string{"class"}, thing{line(0, 0, 10, 0), map[string]string{"class": "Local"}}, thing{line(0, 5, 10, 5), map[string]string{"class": "track"}})
	p.add("grid_lines", []string{"voltage"}, thing{line(0, 0, 10, 0), map[string]string{"voltage": "20"}}, thing{line(0, 9, 10, 9), map[string]string{"voltage": "110"}})
	p.add("habitat", []string{"class"}, thing{square(0, 0, 5), map[string]string{"class": "bog"}})
	p.terrain(func(x, y float64) float64 { return 1 })
	want := map[string]string{
		"rule.setback.roads.class.motorway.wind_m":  "no feature has the class motorway, so the setting has no effect there. Classes of roads here: local, track.",
		"rule.setback.roads.class.local.wind_m":     "",
		"rule.setback.roads.class.TRACK.wind_m":     "",
		"rule.setback.grid_lines.from_220_kv.b_m":   "nothing has 220 kV or more, so the setting has no effect. Voltages of power lines here: 20 kV, 110 kV.",
		"rule.setback.grid_lines.from_110_kv.a_m":   "",
		"rule.setback.grid_lines.from_60_kv.a_m":    "falls under the distance from 110 kV, so the setting has no effect",
		"rule.setback.grid_lines.from_20_kv.a_m":    "",
		"rule.setback.grid_lines.from_60_kv.wind_m": "", // for other plants nothing higher is set
		"rule.setback.water.wind_m":                 "the study has no layer of rivers, lakes and coast yet",
		"rule.measured_from.heritage":               "the study has no layer of heritage yet",
		"rule.exclude.forest":                       "the study has no layer of forest yet",
		"rule.exclude.habitat.class":                "no feature has the class meadow, so",
		"layer.tolerance.flood_m":                   "the study has no layer of flood areas yet",
		"layer.tolerance.roads_m":                   "",
		"layer.tolerance.terrain_m":                 "what the study has of ground heights is a raster",
		"rule.setback.boundary.wind_m":              "",
		"rule.slope_max.wind_deg":                   "",
	}
	values := map[string]string{"rule.measured_from.heritage": "centroid", "rule.exclude.forest": "yes", "rule.exclude.habitat.class": "bog|meadow"}
	for key := range want {
		v := values[key]
		if v == "" {
			v = "5"
		}
		if err := CheckSetting(p.s.Catalog(), shipped(t), key, v); err != nil {
			t.Fatal(err) // they stay allowed
		}
		p.set(key, v)
	}
	all := p.idle()
	for key, text := range want {
		n, told := all[key]
		if told != (text != "") || !strings.Contains(present.Notice(n), text) {
			t.Errorf("%s: told %v: %s", key, told, present.Notice(n))
		}
		if one, told := p.idle(key)[key]; told != (text != "") || one.Code != n.Code {
			t.Errorf("%s asked alone: %+v", key, one)
		}
	}
	for key := range all {
		if _, asked := want[key]; !asked && !strings.HasPrefix(key, "rule.setback.dwellings") {
			t.Errorf("%s: %s", key, present.Notice(all[key]))
		}
	}
}
