package study_test

import (
	"os"
	"slices"
	"strings"
	"testing"

	"groundtally/app/study"
)

func shippedCatalog(t *testing.T) *study.Catalog {
	t.Helper()
	cat, err := study.LoadCatalog(os.DirFS("../../assets"))
	if err != nil {
		t.Fatal(err)
	}
	return cat
}

func TestNearestKeyIsNearOrNone(t *testing.T) {
	cat := shippedCatalog(t)
	for key, want := range map[string]string{
		"run.sead":                              "run.seed",
		"rule.setbak.dwellings.wind_m":          "rule.setback.dwellings.wind_m",
		"rule.setback.dwellings.wind":           "rule.setback.dwellings.wind_m",
		"plant.big.hub_hight_m":                 "plant.big.hub_height_m",
		"rule.setback.roads.clas.motorway.w_m":  "rule.setback.roads.class.motorway.w_m",
		"colour":                                "",
		"something.else.altogether":             "",
		"x":                                     "",
		"a.b.c.d.e.f.g.h.i.j.k.l.m.n.o.p.q.r.s": "",
	} {
		if got := cat.Nearest(key); got != want {
			t.Errorf("nearest to %q is %q, want %q", key, got, want)
		}
		if err := (&study.UnknownKeyError{Key: key, Nearest: want}).Error(); want == "" && strings.Contains(err, "nearest") {
			t.Errorf("without a near key it is said: %s", err)
		}
	}
}

func TestNear(t *testing.T) {
	names := []string{"dwellings", "roads", "D-12", "D-2", "designated"}
	for word, want := range map[string][]string{"dweling": {"dwellings"}, "ROAD": {"roads"}, "D-22": {"D-12", "D-2"}, "zebra": {}} {
		if got := study.Near(word, names, 3); !slices.Equal(got, want) {
			t.Errorf("near %q are %v, want %v", word, got, want)
		}
	}
}

func TestFieldsCheckWhatIsTyped(t *testing.T) {
	cat := shippedCatalog(t)
	for _, c := range []struct {
		role, field, unit, text, want string // want is empty where the text is refused
	}{
		{"dwellings", "households", "", "12", "12"},
		{"dwellings", "households", "", "lots", ""},
		{"dwellings", "households", "", "-3", ""},
		{"dwellings", "households", "", "NaN", ""},
		{"dwellings", "class", "", "farm", "farm"},
		{"dwellings", "eaves_height", "m", "600 cm", "6"},
		{"dwellings", "eaves_height", "m", "6 kW", ""},
		{"dwellings", "eaves_height", "ft", "3.048 m", "10"},
		{"grid_lines", "voltage", "V", "20 kV", "20000"},
		{"grid_lines", "voltage", "", "20000 V", "20"},
		{"grid_lines", "overhead", "", "Yes", "yes"},
		{"grid_lines", "overhead", "", "true", "yes"},
		{"grid_lines", "overhead", "", "perhaps", ""},
		{"grid_lines", "told_on", "", "2026-05-03", "2026-05-03"},
		{"grid_lines", "told_on", "", "2026-02-30", ""},
		{"parcels", "owner_consent", "", "NOT ASKED", "not asked"},
		{"parcels", "owner_consent", "", "maybe", ""},
		{"viewpoints", "heading", "deg", "361", ""},
		{"sealed_ground", "usable_share", "", "1.2", ""},
		{"peat", "water_table", "", "-0.2", "-0.2"},
		{"height_limit", "limit_kind", "", "above sea", "above sea"},
	} {
		role, ok := cat.Role(c.role)
		f, there := role.Field(c.field)
		if !ok || !there {
			t.Fatalf("no field %s of %s", c.field, c.role)
		}
		got, err := f.Check(c.text, c.unit)
		if (err == nil) != (c.want != "") || got != c.want {
			t.Errorf("%s.%s = %q in %q gives %q, %v; want %q", c.role, c.field, c.text, c.unit, got, err, c.want)
		}
	}
}

func TestCRSWords(t *testing.T) {
	wkt := `PROJCS["ETRS89 / UTM zone 32N",GEOGCS["ETRS89",DATUM["European_Terrestrial_Reference_System_1989",SPHEROID["GRS 1980",6378137,298.257222101]]]]`
	got := study.CRSWords(wkt)
	if !strings.HasPrefix(got, `"ETRS89 / UTM zone 32N" (PROJCS[`) || strings.Contains(got, "SPHEROID") || !strings.Contains(got, "...") {
		t.Errorf("a definition is written %s", got)
	}
	if got := study.CRSWords("EPSG:25832"); got != "EPSG:25832" {
		t.Errorf("a code is written %s", got)
	}
}
