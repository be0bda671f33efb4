package pictures

import (
	"cmp"
	"fmt"
	"math"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/geo/fit"
)

// Layout tells in full how the turbines of a fit came to stand where they stand, a line for each thing, and
// apart from it each rule that turbines placed by hand do not keep. Both are empty where it is not known.
func Layout(f *run.Fit) (words, broken []string) {
	if f == nil || f.Layout == nil {
		return nil, nil
	}
	if f.Layout.How == byHand {
		words = append(words, "Placed by hand: "+cmp.Or(f.Layout.Reason, "no reason given"))
	}
	words = append(words, LayoutWords(f.Layout, len(f.Turbines))...)
	for _, b := range f.Layout.Broken {
		broken = append(broken, BrokenWords(b))
	}
	return words, broken
}

// LayoutWords tells of a layout of n turbines, a line for each thing; nothing of that they were placed by
// hand, which the window says with its reason at another place. What lies below the bound of energy is a
// share of that bound, in %; one turbine has no wakes of its own to lose by, so the bound says nothing of it.
func LayoutWords(l *run.Layout, n int) []string {
	var out []string
	if l.How != "" && l.How != byHand {
		out = append(out, "Found by: "+l.How+".")
	}
	if l.MostByRule > 0 && l.MostBy != fit.BoundByMax {
		words := fmt.Sprintf("Most that the spacing allows: %d at most", l.MostByRule)
		if l.MostBy != "" {
			words += " (" + l.MostBy + ")"
		}
		out = append(out, words+".")
	}
	if l.Asked > 0 {
		words := fmt.Sprintf("Wanted at most: %d", l.Asked)
		if by := cmp.Or(askers[l.AskedBy], l.AskedBy); by != "" {
			words += " (" + by + ")"
		}
		out = append(out, words+".")
	}
	if l.SpacingMet > 0 {
		out = append(out, fmt.Sprintf("The two nearest to each other stand at %.2f times the distance of the spacing rule.", l.SpacingMet))
	}
	if n != 1 && l.BoundMWh > 0 && l.WakedMWh > 0 {
		less := math.Max(0, 1-l.WakedMWh/l.BoundMWh)
		out = append(out, fmt.Sprintf("Energy behind wakes: %.1f %% below the bound of %s MWh a year (%s without any wake), before losses.", 100*less, present.Figure(l.BoundMWh, l.BoundMWh, l.BoundMWh), SoMany(cmp.Or(l.MostByRule, n))))
	}
	return out
}

// askers says in words who wants no more turbines than so many.
var askers = map[string]string{"setting": "set for the option", "power": "by the power that is asked for", "spare capacity": "by the spare capacity of the network", "usual limit": "the usual limit"}

// byHand is what a layout says of itself that the user made.
const byHand = "by hand"

// SoMany writes a number of turbines.
func SoMany(n int) string {
	if n == 1 {
		return "one turbine"
	}
	return fmt.Sprintf("%d turbines", n)
}

// BrokenWords tells of a rule that a turbine placed by hand does not keep. Metres are rounded up, so that no
// breach reads as none.
func BrokenWords(b run.Broken) string {
	who, m := fmt.Sprintf("Turbine %d", b.Turbine), ""
	if b.ByM > 0 {
		m = fmt.Sprintf("%.0f m ", math.Ceil(b.ByM))
	}
	another := "another"
	if b.Other > 0 {
		another = fmt.Sprintf("turbine %d", b.Other)
	}
	switch b.Rule {
	case "outside_ground":
		return who + " stands " + m + "outside the buildable ground"
	case "outside_site":
		return who + " stands " + m + "outside the site"
	case "too_near":
		return who + " stands " + m + "nearer to " + another + " than the spacing allows"
	case "near_existing":
		return who + " stands " + m + "nearer to a turbine of others than the spacing allows"
	case "touching":
		return who + ": its rotor could touch that of " + another
	}
	return who + ": " + present.Rule(b.Rule) + " is not kept"
}
