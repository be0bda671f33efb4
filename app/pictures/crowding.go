package pictures

import (
	"fmt"
	"strconv"
	"strings"

	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
)

// Crowding gives the picture of a plant at several spacings or ground covers.
func Crowding(c *run.Crowded, title, id string) chart.Sweep {
	in := chart.Sweep{Title: title, ID: id, Swept: c.Swept, SweptUnit: c.SweptUnit, Unit: "MWh/(ha yr)", NetAs: "as electricity"}
	for _, p := range c.Points {
		one := chart.CrowdPoint{Item: strconv.FormatFloat(p.Swept, 'g', 4, 64), Swept: p.Swept, Energy: chart.Num(p.MWhPerHaYr), Return: chart.Num(p.EROI), WithStocks: chart.Amount{Why: present.Reason(p.WithStocks.Why)}}
		if p.WithStocks.OK() {
			one.WithStocks = chart.Num(p.WithStocks.X)
		}
		in.Points = append(in.Points, one)
	}
	for _, m := range []struct {
		from run.CrowdedMark
		to   *chart.CrowdMark
		item string
	}{{c.BestReturn, &in.BestReturn, "best return"}, {c.MostNet, &in.MostNet, "most net energy"}, {c.MostEnergy, &in.MostEnergy, "most energy"}, {c.Chosen, &in.Chosen, "choice"}} {
		*m.to = chart.CrowdMark{Item: m.item, Swept: m.from.Swept, Energy: m.from.MWhPerHaYr, Return: m.from.EROI, AtEnd: m.from.AtEnd}
		if m.from.Known {
			m.to.State = chart.Number
		}
	}
	return in
}

// CrowdingWords tells the crowding curve, for those who cannot see it and for whom one number is not enough.
func CrowdingWords(c *run.Crowded) string {
	if c.Why != "" {
		if c.Part != "" {
			return fmt.Sprintf("No crowding curve of the %s part: %s.", map[string]string{"wind": "wind", "solar": "sun"}[c.Part], present.Reason(c.Why))
		}
		return "No crowding curve: " + present.Reason(c.Why) + "."
	}
	unit := strings.TrimSuffix(" "+c.SweptUnit, " ")
	at := func(m run.CrowdedMark) string {
		text := fmt.Sprintf("%.3g%s (%s MWh a year from a hectare, return %.3g)", m.Swept, unit, mwh(m.MWhPerHaYr), m.EROI)
		if m.AtEnd {
			text += ", at the end of what was tried"
		}
		return text
	}
	text := fmt.Sprintf("Fitted as the option says at each %s, for a hectare inside the fence", c.Swept)
	if c.Part != "" {
		text = fmt.Sprintf("With the turbines and the power of the panels as they are, at each %s, for a hectare of the plant's whole ground", c.Swept)
	}
	if c.GroundHa > 0 {
		text = fmt.Sprintf("On %.2f ha of buildable ground, filled at each %s", c.GroundHa, c.Swept)
		if c.Part != "" {
			text = fmt.Sprintf("On %.2f ha of buildable ground, filled with turbines at each %s, the power of the panels as it is", c.GroundHa, c.Swept)
		}
	}
	text += fmt.Sprintf(": the best return at %s; the most net energy, as electricity, at %s; the most energy from a hectare at %s.", at(c.BestReturn), at(c.MostNet), at(c.MostEnergy))
	if c.Chosen.Known {
		text += fmt.Sprintf(" Your option stands at %s.", at(c.Chosen))
	}
	if c.Beyond != "" {
		text += " Some values that were tried are not on the curve: " + present.Reason(c.Beyond) + "."
	}
	best, kw := 0.0, 0.0
	for _, p := range c.Points {
		if p.MWhPerKWYr > kw {
			best, kw = p.Swept, p.MWhPerKWYr
		}
	}
	return text + fmt.Sprintf(" For each kilowatt that may flow to the grid most comes at %.3g%s, %.3g MWh a year. More from a hectare and more for what is spent pull against each other; nothing is chosen for you.", best, unit, kw)
}
