package pictures

import (
	"slices"
	"strings"
	"testing"

	"groundtally/app/run"
	"groundtally/geo"
	"groundtally/geo/fit"
)

// A bound that is only what is wanted says nothing of the spacing.
func TestWhatIsWantedIsNoSpacing(t *testing.T) {
	l := run.Layout{How: "square lattice", MostByRule: 3, MostBy: fit.BoundByMax, Asked: 3, AskedBy: "setting"}
	if got := LayoutWords(&l, 3); slices.ContainsFunc(got, func(w string) bool { return strings.Contains(w, "spacing allows") }) {
		t.Errorf("%q", got)
	}
}

func TestLayoutWords(t *testing.T) {
	l := run.Layout{How: "square lattice", MostByRule: 8, MostBy: "cover by rectangles", SpacingMet: 1.02, BoundMWh: 80000, WakedMWh: 76000, Asked: 12, AskedBy: "usual limit"}
	want := []string{
		"Found by: square lattice.", "Most that the spacing allows: 8 at most (cover by rectangles).", "Wanted at most: 12 (the usual limit).",
		"The two nearest to each other stand at 1.02 times the distance of the spacing rule.",
		"Energy behind wakes: 5.0 % below the bound of 80 000 MWh a year (8 turbines without any wake), before losses.",
	}
	if got := LayoutWords(&l, 7); !slices.Equal(got, want) {
		t.Errorf("%q", got)
	}
	if got := LayoutWords(&l, 1); !slices.Equal(got, want[:4]) { // the same, so that nothing but the number of turbines matters
		t.Errorf("one turbine: %q", got)
	}
	if got := LayoutWords(&run.Layout{How: "by hand", Reason: "why"}, 1); len(got) != 0 {
		t.Errorf("by hand, which is said elsewhere: %q", got)
	}
	fit := &run.Fit{Turbines: make([]geo.LonLat, 7), Layout: &l}
	if words, broken := Layout(fit); !slices.Equal(words, want) || broken != nil {
		t.Errorf("%q, %q", words, broken)
	}
}

func TestLayoutByHand(t *testing.T) {
	fit := &run.Fit{Turbines: make([]geo.LonLat, 2), Layout: &run.Layout{How: "by hand", Reason: "off the path", SpacingMet: 0.9, Broken: []run.Broken{{Turbine: 2, Rule: "too_near", Other: 1, ByM: 12}, {Turbine: 2, Rule: "outside_site", ByM: 7}}}}
	words, broken := Layout(fit)
	if !slices.Equal(words, []string{"Placed by hand: off the path", "The two nearest to each other stand at 0.90 times the distance of the spacing rule."}) {
		t.Errorf("%q", words)
	}
	if !slices.Equal(broken, []string{"Turbine 2 stands 12 m nearer to turbine 1 than the spacing allows", "Turbine 2 stands 7 m outside the site"}) {
		t.Errorf("%q", broken)
	}
	fit.Layout.Reason = ""
	if words, _ := Layout(fit); words[0] != "Placed by hand: no reason given" {
		t.Errorf("%q", words)
	}
	for _, none := range []*run.Fit{nil, {}} {
		if words, broken := Layout(none); words != nil || broken != nil {
			t.Errorf("of nothing: %q, %q", words, broken)
		}
	}
}

func TestBrokenWords(t *testing.T) {
	for want, b := range map[string]run.Broken{
		"Turbine 3 stands 41 m outside the buildable ground":                         {Turbine: 3, Rule: "outside_ground", ByM: 40.2},
		"Turbine 3 stands outside the buildable ground":                              {Turbine: 3, Rule: "outside_ground"},
		"Turbine 1 stands 7 m outside the site":                                      {Turbine: 1, Rule: "outside_site", ByM: 7},
		"Turbine 2 stands 12 m nearer to turbine 1 than the spacing allows":          {Turbine: 2, Rule: "too_near", Other: 1, ByM: 12},
		"Turbine 2 stands 5 m nearer to a turbine of others than the spacing allows": {Turbine: 2, Rule: "near_existing", ByM: 5},
		"Turbine 2: its rotor could touch that of turbine 1":                         {Turbine: 2, Rule: "touching", Other: 1, ByM: 5},
	} {
		if got := BrokenWords(b); got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
}

func TestWakeModels(t *testing.T) {
	if got := WakeModels([]run.WakeModelYield{{Model: "Gaussian", WakeLoss: 0.0812}, {Model: "top hat", WakeLoss: 0.074}}); !strings.HasPrefix(got, "Wake loss: Gaussian 8.1 %, top hat 7.4 %.") {
		t.Errorf("%q", got)
	}
}
