package pictures

import (
	"fmt"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring/energy"
)

// SavedSpan writes a saving with its ends.
func SavedSpan(s energy.SavedSpan) string {
	one := func(x energy.Saved) string {
		if x.Never {
			return "never"
		}
		return mwh(x.MWhPerYr)
	}
	if s.Central.Never {
		return "no saving does the same"
	}
	if s.Low == s.High {
		return one(s.Central) + " MWh a year"
	}
	return fmt.Sprintf("%s MWh a year (%s to %s)", one(s.Central), one(s.Low), one(s.High))
}

// Saving tells which saving at the place of use would do the same as a plant; why is a code where it is not known.
func Saving(s *run.Saving, why string) string {
	if s == nil {
		return "Saving that equals it: unknown, " + present.Reason(why) + "."
	}
	text := fmt.Sprintf("Using less does the same from %s if only the same use rebounds, and from %s if the whole economy does; ranges take all assumptions at one end.", SavedSpan(s.Equal.Direct), SavedSpan(s.Equal.Economy))
	if !s.Equal.NetKnown {
		return text + " The energy spent on the saving itself is not counted, nor that spent on the plant; enter saving.investment_mj_per_mwh to set net against net."
	}
	return text + fmt.Sprintf(" Net of what is spent on each: %s, and %s.", SavedSpan(s.Equal.NetDirect), SavedSpan(s.Equal.NetEconomy))
}

// About tells what an alternative stands for, or why it is not known.
func About(a *run.Alternative) string {
	if a.Unknown != "" {
		return a.Title + ": unknown, " + present.Reason(a.Unknown) + "."
	}
	return a.Title + ": " + a.About + "."
}

// Beside tells where an alternative would stand in an order of n places.
func Beside(b run.Beside, titles func(key string) string) string {
	if b.Why != "" {
		return b.Title + ": unknown, " + present.Reason(b.Why) + "."
	}
	text := fmt.Sprintf("%s would stand at place %d with a score of %.3f (%.3f to %.3f): %s.", b.Title, b.Place, b.Score, b.ScoreLow, b.ScoreHigh, b.About)
	if len(b.Unknown) > 0 {
		names := make([]string, len(b.Unknown))
		for i, k := range b.Unknown {
			names[i] = titles(k)
		}
		text += " Unknown of it: " + strings.Join(names, ", ") + "."
	}
	return text
}

// Spared tells what a saved share of the energy of a plan makes needless.
func Spared(p *run.SparePlan, share float64, s energy.Spared, e energy.SavingEquals) string {
	wanted := map[string]string{"target": "the energy that the district wants", "demand": "what the district uses", "all": "what all sites of the order give"}[p.Basis]
	text := fmt.Sprintf("For %s, %s MWh a year, the first %d of the sites in this order are built", wanted, mwh(p.WantedMWh), len(p.Sites))
	if p.Short {
		text += ", all there are, which is not enough"
	}
	text += "."
	if share > 0 {
		text += fmt.Sprintf(" With %s %% of that energy saved, after rebound, %d are still built and %d of them spared", mwh(100*share), s.StillBuilt, len(s.Sites))
		if len(s.Sites) > 0 {
			text += fmt.Sprintf(": %s ha of ground taken directly, %s ha in all, %s ha years, and %s t of carbon in soil, peat and plants", mwh(s.DirectHa), mwh(s.TotalHa), mwh(s.OccupationHaYr), mwh(s.StockTC))
			if s.StockUnknown > 0 {
				text += fmt.Sprintf(" (unknown for %d of the spared sites)", s.StockUnknown)
			}
		}
		text += fmt.Sprintf(". At the place of use that takes %s, or %s if the whole economy rebounds.", SavedSpan(e.Direct), SavedSpan(e.Economy))
	}
	if p.LeftOut > 0 {
		text += fmt.Sprintf(" Left out, since energy or ground is not known: %d of the sites.", p.LeftOut)
	}
	return text
}

// Habitat tells which habitat a candidate touches, a line for each class, and into how many pieces it falls. Life is
// in years, 0 where it is not known.
func Habitat(h *run.Habitat, lifeYr float64) []string {
	if h == nil {
		return nil
	}
	var out []string
	for _, k := range h.Kinds {
		line := k.Class
		if k.Condition != "" {
			line += ", condition " + k.Condition
		}
		if k.Protection != "" {
			line += ", " + k.Protection
		}
		switch k.Irreplaceable {
		case "yes":
			line += ", IRREPLACEABLE"
		case "unknown":
			line += ", not said whether it can be replaced"
		}
		line += fmt.Sprintf(": %s ha lost", mwh(k.LostHa))
		if lifeYr > 0 && k.LostHa > 0 {
			line += fmt.Sprintf(" (%s ha years)", mwh(k.LostHa*lifeYr))
		}
		if k.EdgeHa > 0 {
			line += fmt.Sprintf(", %s ha more in the disturbed edge", mwh(k.EdgeHa))
		}
		out = append(out, line)
	}
	if p := h.Pieces; p != nil {
		out = append(out, fmt.Sprintf("pieces of the touched habitat: %d before, %d after; the largest %s ha before, %s ha after", p.Before, p.After, mwh(p.LargestBeforeHa), mwh(p.LargestAfterHa)))
	}
	return out
}
