package pictures

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/draw/chart"
	"groundtally/app/present"
)

// amountWords writes a number with its range, or the state with its reason.
func amountWords(a chart.Amount, unit string) string {
	if a.State != chart.Number {
		word := string(a.State)
		if a.State == chart.Unknown {
			word = "unknown"
		}
		if a.Why != "" {
			word += " (" + a.Why + ")"
		}
		return word
	}
	if a.High <= a.Low {
		return strings.TrimSpace(present.Figure(a.X, a.X, a.X) + " " + unit)
	}
	return strings.TrimSpace(present.Figure(a.X, a.Low, a.High)+" "+unit) + fmt.Sprintf(" (%s to %s)", present.Figure(a.Low, a.Low, a.High), present.Figure(a.High, a.Low, a.High))
}

// BoundariesWords tells the energy return by boundary for readers who cannot see the picture.
func BoundariesWords(in chart.Boundaries) string {
	names := []string{"at plant", "at grid", "whole life", "with stocks"}
	if in.NoStocks {
		names = names[:chart.WithStocks]
	}
	kind, more := in.Kind, " "+strings.ReplaceAll(in.Caption, "\n", " ")
	if kind == "" {
		kind, more = chart.ElectricOverPrimary, ""
	}
	var out, spent []string
	for b, name := range names {
		out = append(out, name+" "+amountWords(in.Rungs[b].Return, ""))
	}
	for _, p := range in.Parts {
		spent = append(spent, p.Name+" "+amountWords(p.Spent, in.Unit))
	}
	return "Energy return, " + kind + ": " + strings.Join(out, "; ") + ". Out " + amountWords(in.Rungs[chart.AtPlant].Out, in.Unit) + " at the plant, " + amountWords(in.Rungs[chart.AtGrid].Out, in.Unit) + " at the grid. Spent: " + strings.Join(spent, "; ") + "." + more
}

// GroundWords tells the ground taken.
func GroundWords(in chart.Ground) string {
	var out []string
	for _, k := range []struct {
		name string
		kind chart.LandKind
	}{{"total ground", in.Total}, {"sealed or built", in.Permanent}, {"disturbed while building", in.Temporary}, {"farmland", in.Farmland}, {"habitat", in.Habitat}, {"forest", in.Forest}, {"peat", in.Peat}} {
		out = append(out, k.name+" "+amountWords(k.kind.Ha, "ha"))
	}
	return "Ground taken, kinds that may lie over each other: " + strings.Join(out, "; ") + ". Ground times years: " + amountWords(in.HaYears, "ha yr") + "."
}

// PaybackWords tells when what is caused is paid back under each grid factor.
func PaybackWords(in chart.Balances) string {
	var out []string
	for _, c := range in.Cases {
		out = append(out, c.Name+": "+amountWords(c.Payback, "yr"))
	}
	text := "Carbon payback under each grid factor: " + strings.Join(out, "; ") + "."
	if in.Caption != "" {
		text += " " + in.Caption
	}
	return text
}

// DriversWords tells the strongest of what moves a quantity.
func DriversWords(in chart.Drivers) string {
	const most = 5
	known := slices.DeleteFunc(slices.Clone(in.Groups), func(d chart.Driver) bool { return d.Rank.State != chart.Number })
	slices.SortStableFunc(known, func(a, b chart.Driver) int { return cmp.Compare(math.Abs(b.Rank.X), math.Abs(a.Rank.X)) })
	if len(known) == 0 {
		return fmt.Sprintf("Nothing that varies moves %s, over %d trials.", in.What, in.Trials)
	}
	var out []string
	for _, d := range known[:min(most, len(known))] {
		out = append(out, fmt.Sprintf("%s %+.2f", d.Name, d.Rank.X))
	}
	text := fmt.Sprintf("What moves %s, by rank correlation over %d trials: ", in.What, in.Trials) + strings.Join(out, "; ")
	if rest := len(known) - most; rest > 0 {
		text += fmt.Sprintf("; and %d weaker", rest)
	}
	return text + "."
}
