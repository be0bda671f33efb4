package study_test

import (
	"os"
	"reflect"
	"strings"
	"testing"

	"groundtally/app/study"
)

// What a grid holds is asked for, proposed from its name, and taken only with the user's word; what was said of the
// layer that is replaced holds on.
func TestGridsAreDescribed(t *testing.T) {
	cat, err := study.LoadCatalog(os.DirFS("../../assets"))
	if err != nil {
		t.Fatal(err)
	}
	wind, _ := cat.Role("wind_resource")
	sun, _ := cat.Role("solar_resource")
	terrain, _ := cat.Role("terrain")
	describe := func(role study.Role, in study.Import, snap study.Snapshot) (study.LayerRecord, string) {
		rec := study.LayerRecord{Name: "grid", Role: role.Name, Kind: "raster", Match: map[string]string{}, Units: map[string]string{}}
		var asked []string
		for _, q := range study.DescribeGrid(&rec, in, role, &snap) {
			asked = append(asked, q.Option+" / "+q.Text)
		}
		return rec, strings.Join(asked, "\n")
	}
	none := study.Snapshot{}
	for _, c := range []struct {
		name  string
		role  study.Role
		in    study.Import
		asked []string // empty when nothing is
		use   study.GridUse
	}{
		{"nothing said", wind, study.Import{Base: "data.tif"}, []string{"--match height=HEIGHT", "--match mean_speed=band1"}, study.GridUse{}},
		{"the name proposes", wind, study.Import{Base: "weibull_k_80m.tif"}, []string{"--match height=80 ", "--match weibull_k=band1", "says weibull_k", "says 80"}, study.GridUse{}},
		{"the proposals are taken", wind, study.Import{Base: "Mean speed 100 m.tif", AcceptProposals: true}, nil, study.GridUse{Field: "mean_speed", Unit: "m/s", HeightM: 100}},
		{"no name, so nothing to take", wind, study.Import{Base: "data.tif", AcceptProposals: true}, []string{"--match height", "--match mean_speed"}, study.GridUse{}},
		{"the unit is asked for", wind, study.Import{Base: "a.tif", Match: map[string]string{"mean_speed": "band1", "height": "50"}}, []string{"--unit band1=m/s"}, study.GridUse{}},
		{"all said", wind, study.Import{Base: "a.tif", Match: map[string]string{"weibull_a": "band1", "height": "50"}, Units: map[string]string{"band1": "km/h"}}, nil, study.GridUse{Field: "weibull_a", Unit: "km/h", HeightM: 50}},
		{"a plain number needs no unit", wind, study.Import{Base: "a.tif", Match: map[string]string{"weibull_k": "band1", "height": "50"}}, nil, study.GridUse{Field: "weibull_k", HeightM: 50}},
		{"a unit of something else", wind, study.Import{Base: "a.tif", Match: map[string]string{"mean_speed": "band1", "height": "50"}, Units: map[string]string{"band1": "kW"}}, []string{"cannot be brought to m/s"}, study.GridUse{}},
		{"a height that is none", wind, study.Import{Base: "a.tif", Match: map[string]string{"weibull_k": "band1", "height": "-5"}}, []string{"not between 0 and 1000"}, study.GridUse{}},
		{"a band that is not there", wind, study.Import{Base: "a.tif", Match: map[string]string{"mean_speed": "band2", "height": "5"}}, []string{"mean_speed=band2 is none of these", "what are the values"}, study.GridUse{}},
		{"a field of sectors", wind, study.Import{Base: "a.tif", Match: map[string]string{"sector_from": "band1"}}, []string{"sector_from=band1 is none of these", "--match height", "what are the values"}, study.GridUse{}},
		{"two fields at once", wind, study.Import{Base: "a.tif", Match: map[string]string{"mean_speed": "band1", "weibull_a": "band1", "height": "5"}, Units: map[string]string{"band1": "m/s"}}, []string{"cannot be mean_speed and weibull_a at once"}, study.GridUse{}},
		{"sums of a day", sun, study.Import{Base: "ghi_07.tif", AcceptProposals: true, Units: map[string]string{"band1": "kWh/(m2 day)"}}, nil, study.GridUse{Field: "ghi", Unit: "kWh/(m2 day)", Month: 7}},
		{"the unit of a day is named", sun, study.Import{Base: "a.tif", Match: map[string]string{"ghi": "band1", "month": "1"}}, []string{"Sums of a day are kWh/(m2 day)"}, study.GridUse{}},
		{"a month that is none", sun, study.Import{Base: "a.tif", Match: map[string]string{"albedo": "band1", "month": "13"}}, []string{"13 is not a month"}, study.GridUse{}},
		{"no year is a month", sun, study.Import{Base: "ghi_2019.tif", AcceptProposals: true}, []string{"--match month=MONTH"}, study.GridUse{}},
	} {
		rec, asked := describe(c.role, c.in, none)
		for _, want := range c.asked {
			if !strings.Contains(asked, want) {
				t.Errorf("%s: asked\n%s\nwant %q", c.name, asked, want)
			}
		}
		if len(c.asked) > 0 {
			if len(rec.Match) > 0 {
				t.Errorf("%s: a match %v in spite of a question", c.name, rec.Match)
			}
			continue
		}
		use, err := study.GridUseOf(rec)
		if asked != "" || err != nil || use != c.use {
			t.Errorf("%s: %+v, %v, asked %q; want %+v", c.name, use, err, asked, c.use)
		}
	}
	if rec, asked := describe(terrain, study.Import{Base: "dem.tif"}, none); asked != "" || len(rec.Match) > 0 {
		t.Errorf("ground heights: %v, asked %q", rec.Match, asked)
	}
	old, _ := describe(wind, study.Import{Base: "mean_speed_100m.tif", AcceptProposals: true}, none)
	rec, asked := describe(wind, study.Import{Base: "new.tif", Replace: "grid"}, study.Snapshot{Layers: []study.LayerRecord{old}})
	if asked != "" || !reflect.DeepEqual(rec.Match, old.Match) || !reflect.DeepEqual(rec.Units, old.Units) {
		t.Errorf("a new edition: %v, %v, asked %q", rec.Match, rec.Units, asked)
	}
	if _, err := study.GridUseOf(study.LayerRecord{Name: "W", Role: "wind_resource"}); err == nil || !strings.Contains(err.Error(), `--replace "W" --match mean_speed=band1`) {
		t.Errorf("a grid of which nothing was said: %v", err)
	}
	delete(rec.Match, "height")
	if _, err := study.GridUseOf(rec); err == nil || !strings.Contains(err.Error(), "height") {
		t.Errorf("a grid without its height: %v", err)
	}
}
