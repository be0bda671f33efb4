package pictures

import (
	"math"
	"slices"
	"strings"

	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
	"groundtally/scoring/climate"
	"groundtally/scoring/criteria"
	"groundtally/scoring/units"
)

// AmountOf carries a consequence over with its range, or with its state and the reason in words.
func AmountOf(q scoring.Consequence) chart.Amount {
	switch q.State {
	case scoring.Number:
		return chart.Ranged(q.Low, q.Central, q.High)
	case scoring.NotSet:
		return chart.Amount{State: chart.NotSet, Why: reasonOf(q)}
	case scoring.None:
		return chart.Amount{State: chart.None, Why: reasonOf(q)}
	case scoring.Never:
		return chart.Amount{State: chart.Never, Why: reasonOf(q)}
	case scoring.NotAssessed:
		return chart.Amount{State: chart.NotAssessed, Why: reasonOf(q)}
	}
	return chart.Amount{Why: reasonOf(q)}
}

// reasonOf is the reason without the state, which stands beside it.
func reasonOf(q scoring.Consequence) string {
	words := present.WhyNot(q)
	if _, rest, ok := strings.Cut(words, ": "); ok && strings.HasPrefix(words, q.State.String()+": ") {
		return rest
	}
	if words == q.State.String() {
		return ""
	}
	return words
}

// consequence is what a candidate has under a key; without it it is unknown for the candidate's status.
func consequence(c *run.Candidate, key string) chart.Amount {
	q, ok := c.Consequence(key)
	if !ok {
		q = scoring.Consequence{Key: key, State: scoring.Unknown, Why: "no_such_quantity"}
		if c.Status != run.Fitted {
			q.Why = c.Status
		}
	}
	return AmountOf(q)
}

// central carries a value over, times a factor, without a range.
func central(v scoring.Value, times float64) chart.Amount {
	x := v.X * times
	return AmountOf(scoring.Consequence{State: v.State, Why: v.Why, Low: x, Central: x, High: x})
}

// Boundaries shows what a candidate gives and what is spent on it at each boundary, in TJ: electricity out over primary
// energy in, as eroi_generation to eroi_stock count it. Value gives central values by name.
func Boundaries(c *run.Candidate, value func(name string) scoring.Value, title, id string) chart.Boundaries {
	in := chart.Boundaries{Title: title, ID: id, Unit: "TJ", Caption: "Energies are central values; the range of a return is P10 to P90 of the trials."}
	tj := func(name string) chart.Amount { return central(value(name), 1/units.MJPerTJ) }
	for b, key := range []string{"eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock"} {
		out := "delivered_mj_life"
		if chart.Boundary(b) == chart.AtPlant {
			out = "generated_mj_life"
		}
		in.Rungs[b] = chart.Rung{Item: key, Out: tj(out), Return: consequence(c, key)}
	}
	upkeep := tj("input_upkeep_mj_per_yr")
	if life := value("life_yr"); upkeep.State == chart.Number && life.OK() {
		upkeep = chart.Num(upkeep.X * life.X)
	} else if upkeep.State == chart.Number {
		upkeep = central(life, 1)
	}
	in.Parts = []chart.EnergyPart{
		{Item: "input_generator_mj", Name: "machines and panels", At: chart.AtPlant, Spent: tj("input_generator_mj")},
		{Item: "input_works_mj", Name: "pads, tracks and fence", At: chart.AtPlant, Spent: tj("input_works_mj")},
		{Item: "input_connection_mj", Name: "connection", At: chart.AtGrid, Spent: tj("input_connection_mj")},
		{Item: "input_upkeep_mj_per_yr", Name: "upkeep over the life", At: chart.WholeLife, Spent: upkeep},
		{Item: "input_end_mj", Name: "replacing, dismantling, restoring", At: chart.WholeLife, Spent: tj("input_end_mj")},
		{Item: "stock_mj", Name: "lost soil, peat and plant carbon", At: chart.WithStocks, Spent: tj("stock_mj")},
	}
	return in
}

// PrimaryEquivalent is the value of energy.primary_equivalent under which PrimaryBoundaries is shown.
const PrimaryEquivalent = "on"

// PrimaryBoundaries shows the same with the electricity counted as the primary energy that the grid would spend for it,
// EROI_PE-eq = EROI / η_G of IEA-PVPS Task 12, without stocks and without ranges. It has a picture of its own: on one
// axis with the electric return it would mislead.
func PrimaryBoundaries(c *run.Candidate, value func(name string) scoring.Value, title, id string) chart.Boundaries {
	in := Boundaries(c, value, title, id)
	in.NoStocks = true
	in.Parts = slices.DeleteFunc(in.Parts, func(p chart.EnergyPart) bool { return p.At == chart.WithStocks })
	η := value("grid_efficiency")
	primary := func(a chart.Amount) chart.Amount {
		switch {
		case a.State != chart.Number:
			return a
		case !η.OK():
			return central(η, 1)
		}
		return chart.Num(a.X / η.X)
	}
	for b := range in.Rungs {
		in.Rungs[b].Out, in.Rungs[b].Return = primary(in.Rungs[b].Out), primary(in.Rungs[b].Return)
	}
	in.Rungs[chart.WithStocks] = chart.Rung{}
	efficiency := "unknown"
	if η.OK() {
		efficiency = present.Exact(η.X)
	}
	in.Kind = "primary equivalent out, at a grid efficiency of " + efficiency + ", over primary energy spent"
	in.Caption = "Central values only. EROI_PE-eq in the words of IEA-PVPS Task 12: electricity over the grid efficiency " + efficiency + ", MJ of electricity for each MJ of primary energy.\nNot to be set beside the electric return."
	return in
}

// GroundTaken shows the land that a candidate takes, by kind, and for how long.
func GroundTaken(c *run.Candidate, value func(name string) scoring.Value, title, id string) chart.Ground {
	kind := func(key, years, remark string) chart.LandKind {
		out := chart.LandKind{Item: key, Ha: consequence(c, key), Years: chart.Amount{State: chart.None}}
		if out.Ha.State == chart.Number {
			out.Remark = remark
		}
		if years != "" {
			out.Years = central(value(years), 1)
		}
		return out
	}
	in := chart.Ground{Title: title, ID: id,
		Total:     kind("footprint_total_ha", "life_yr", ""),
		Permanent: kind("footprint_permanent_ha", "life_yr", ""),
		Temporary: kind("footprint_temporary_ha", "disturbed_years", ""),
		Farmland:  chart.LandKind{Item: "farmland_lost_ha", Ha: central(value("farmland_lost_ha"), 1), Years: chart.Amount{State: chart.None}},
		Habitat:   kind("habitat_ha", "", "built on or in the disturbed edge"),
		Forest:    kind("forest_ha", "", ""),
		Peat:      kind("peat_ha", "", "dug or drained"),
		HaYears:   consequence(c, "occupation_ha_yr"),
		Caption:   "Ground times years counts the ground taken directly, inside a solar fence all of it, and the ground disturbed while building.",
	}
	return in
}

// Paybacks shows what a candidate has displaced less what it has caused, one line for each grid factor. Without lines
// it says why, a code, in words.
func Paybacks(c *run.Candidate, lines []climate.Line, why string, value func(name string) scoring.Value, title, id string) chart.Balances {
	in := chart.Balances{Title: title, ID: id}
	if life := value("life_yr"); life.OK() {
		in.LifeYr = life.X
	}
	if len(lines) == 0 {
		none := consequence(c, "carbon_payback_yr")
		if none.State == chart.Number { // it is known, but not the way to it
			none = chart.Amount{}
		}
		if why != "" {
			none.Why = present.Reason(why)
		}
		in.Cases = []chart.Balance{{Item: "carbon_payback_yr", Name: "grid factor", Tonnes: []chart.Amount{none}, Payback: none}}
		return in
	}
	var late []string
	part := false
	for _, l := range lines {
		b := chart.Balance{Item: "carbon_payback_yr", Name: l.Grid.Name, Payback: chart.Ranged(l.High.Yr, l.Central.Yr, l.Low.Yr)}
		switch {
		case l.Central.Never:
			b.Payback = chart.Amount{State: chart.Never}
		case l.Low.Never: // there is no upper end
			b.Payback = chart.Num(l.Central.Yr)
			late = append(late, l.Grid.Name)
		}
		for _, p := range l.Points {
			if p.Year != math.Trunc(p.Year) { // the picture goes by whole years
				part = true
				continue
			}
			b.Tonnes = append(b.Tonnes, chart.Ranged(p.Low, p.Central, p.High))
		}
		in.Cases = append(in.Cases, b)
	}
	in.Caption = "Low takes all caused at its most and all displaced at its least, high the other way."
	if len(late) > 0 {
		in.Caption += " At the low end it is never paid back within the life with " + strings.Join(late, " and ") + "."
	}
	if part {
		in.Caption += " The last year is not a whole one and is not drawn."
	}
	return in
}

// DriversOf shows what a quantity follows over the trials. A group that does not vary moves nothing.
func DriversOf(drivers []run.Driver, trials int, what, title, id string) chart.Drivers {
	in := chart.Drivers{Title: title, ID: id, What: what, Trials: trials}
	for _, d := range drivers {
		rank := chart.Amount{State: chart.None, Why: "it does not vary"}
		if d.Known {
			rank = chart.Num(d.Rho)
		}
		in.Groups = append(in.Groups, chart.Driver{Item: d.Name, Name: d.Title, Rank: rank})
	}
	return in
}

// Better gives a function that tells which way a consequence is better; either where there is no such way.
func Better(cat *study.Catalog) func(key string) chart.Better {
	return func(key string) chart.Better {
		c, ok := cat.Criterion(key)
		switch {
		case ok && c.Better == criteria.Less:
			return chart.Less
		case ok && c.Better == criteria.More:
			return chart.More
		}
		return chart.Either
	}
}

// AccountKeys are the consequences that Accounts sets side by side, by account.
var AccountKeys = []struct {
	Name string
	Keys []string
}{
	{"Energy", []string{"eroi_generation", "eroi_delivered", "eroi_extended", "eroi_stock", "energy_payback_yr"}},
	{"Land", []string{"footprint_direct_ha", "footprint_total_ha", "occupation_ha_yr", "soil_carbon_loss_tc", "peat_ha"}},
	{"Climate", []string{"ghg_g_per_kwh", "ghg_life_tco2e", "displaced_tco2e_per_yr", "net_displaced_tco2e_life", "carbon_payback_yr"}},
}

// Accounts sets two candidates side by side. Info and better tell of a consequence.
func Accounts(pair [2]*run.Candidate, names [2]string, info func(key string) run.KeyInfo, better func(key string) chart.Better, title, id string) chart.Accounts {
	in := chart.Accounts{Title: title, ID: id, NameA: names[0], NameB: names[1]}
	var ranges []string
	for _, g := range AccountKeys {
		group := chart.AccountGroup{Name: g.Name}
		for _, key := range g.Keys {
			k := info(key)
			for _, c := range pair {
				q, _ := c.Consequence(key)
				if words := present.RangeWords(q.Range); q.State == scoring.Number && q.High > q.Low && !slices.Contains(ranges, words) {
					ranges = append(ranges, words)
				}
			}
			group.Rows = append(group.Rows, chart.AccountRow{Item: key, Title: k.Title, Unit: present.Unit(k.Unit), Better: better(key),
				A: consequence(pair[0], key), B: consequence(pair[1], key), OverA: slices.Contains(pair[0].OverLimit, key), OverB: slices.Contains(pair[1].OverLimit, key)})
		}
		in.Groups = append(in.Groups, group)
	}
	if len(ranges) > 0 {
		in.Caption = "Ranges: " + strings.Join(ranges, "; ") + "."
	}
	return in
}
