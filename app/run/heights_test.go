package run

import (
	"reflect"
	"strings"
	"testing"
)

// Reference machines of a published hub height have their tips at 270, 218, 175, 153, 53.8, 36.2 m.
func TestTallestMachineUnderAHeightLimit(t *testing.T) {
	limited := func(limit, kind string, side float64) *plain {
		p := windYield(t) // tip 150 m
		p.set("plant.wind.title", "Ours")
		p.add("height_limit", []string{"limit_value", "limit_kind"}, thing{square(-600, -600, side), map[string]string{"limit_value": limit, "limit_kind": kind}})
		return p
	}
	see := func(what string, p *plain, status string, limit float64, everywhere bool, tallest string, tip float64, reason string) {
		t.Helper()
		all := p.results(nil)
		c := &all.Candidates[0]
		for i := range all.Candidates {
			if all.Candidates[i].Plant == "wind" {
				c = &all.Candidates[i]
			}
		}
		h := c.Headroom
		if h == nil {
			t.Errorf("%s: %s %s, no headroom", what, c.Status, c.Reason)
			return
		}
		got := ""
		if h.Tallest != nil {
			got = h.Tallest.ID
			if h.Tallest.TipM != tip {
				t.Errorf("%s: its tip is at %v m, want %v", what, h.Tallest.TipM, tip)
			}
		}
		if c.Status != status || h.TipM != 150 || h.LimitM != limit || h.Everywhere != everywhere || got != tallest || h.Lowest.ID != "dw20_12_4" || h.Lowest.TipM != 36.2 {
			t.Errorf("%s: %s %+v, fits %q; want %s, %v m, %v, %q", what, c.Status, h, got, status, limit, everywhere, tallest)
		}
		if (reason == "") != (c.Reason == "") || !strings.Contains(c.Reason, reason) {
			t.Errorf("%s: %q, want %q", what, c.Reason, reason)
		}
		if !reflect.DeepEqual(c.PublicJSON()["headroom"], h) {
			t.Errorf("%s: %v", what, c.PublicJSON()["headroom"])
		}
		snap, err := p.s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		for _, o := range Register(snap, all) {
			if o.Plant == "wind" && (o.Headroom != h || o.Reason != c.Reason) {
				t.Errorf("%s: in the register %+v %q", what, o.Headroom, o.Reason)
			}
		}
	}
	low := limited("120", "above ground", 1200)
	see("a lower reference machine", low, NoRoom, 120, false, "dw100_27_6", 53.8, "the tallest known machine that fits under the height limits of the site is Community reference 100 kW with its tip at 53.8 m; its mast keeps half a rotor")
	low.set("plant.low.technology", "wind", "plant.low.hub_height_m", "80", "plant.low.rotor_diameter_m", "80", "plant.low.rated_kw", "1000")
	see("another plant option", low, NoRoom, 120, false, "low", 120, "is low with its tip at 120 m")
	low.set("plant.low.hub_height_m", "80.1")
	see("a tenth of a metre too tall", low, NoRoom, 120, false, "dw100_27_6", 53.8, "53.8 m")
	see("none fits", limited("30", "above ground", 1200), NoRoom, 30, false, "", 0, "none of the known machines fits under the height limits of the site; the lowest is Community reference 20 kW with its tip at 36.2 m")
	see("the machine fits, and a taller one would", limited("160", "above ground", 1200), Fitted, 160, false, "nrel_5mw_126", 153, "")
	part := limited("160", "above ground", 1200)
	part.add("exclusion", []string{"reason"}, thing{square(-450, -450, 900), map[string]string{"reason": "test"}})
	part.set("plant.wind.hub_height_m", "100", "rule.smallest_patch.wind_ha", "500")
	c := &part.results(nil).Candidates[0]
	if c.Status != NoRoom || c.Headroom != nil || c.Reason != "" {
		t.Errorf("out by other rules under a limit that is high enough: %s, %+v, %q", c.Status, c.Headroom, c.Reason)
	}
	free := limited("120", "above ground", 1000) // a strip in the north and east has no limit
	free.set("rule.smallest_patch.wind_ha", "30")
	see("some of the site has no limit", free, NoRoom, 120, true, "dw100_27_6", 53.8, "under all height limits on the site")
	sea := limited("140", "above sea", 1200)
	sea.terrain(func(x, y float64) float64 { return 80 })
	see("above the sea", sea, NoRoom, 60, false, "dw100_27_6", 53.8, "53.8 m")
	bare := windYield(t)
	if c := &bare.results(nil).Candidates[0]; c.Status != Fitted || c.Headroom != nil {
		t.Errorf("without limits: %s, %+v", c.Status, c.Headroom)
	}
}

// A plant option that becomes lower renews what is said of another one, from kept results as in a fresh run.
func TestHeadroomIsRenewed(t *testing.T) {
	p := windYield(t)
	p.add("height_limit", []string{"limit_value", "limit_kind"}, thing{square(-600, -600, 1200), map[string]string{"limit_value": "120", "limit_kind": "above ground"}})
	p.set("plant.low.technology", "wind", "plant.low.hub_height_m", "90", "plant.low.rotor_diameter_m", "80", "plant.low.rated_kw", "1000")
	cache := &Memory{}
	p.results(cache)
	p.set("plant.low.hub_height_m", "70")
	kept, fresh := p.results(cache), p.results(nil)
	for i := range fresh.Candidates {
		if a, b := kept.Candidates[i].Headroom, fresh.Candidates[i].Headroom; b == nil || b.Tallest.ID != "low" || !reflect.DeepEqual(a, b) {
			t.Errorf("%s: %+v, fresh %+v", fresh.Candidates[i].ID(), a, b)
		}
	}
}
