package term

import (
	"fmt"
	"slices"
	"strings"

	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/scoring"
)

var verbWhy = verb{
	name: "why", usage: "why STUDY.gpkg SITE PLANT [KEY] [--against SITE/PLANT] [--frozen NAME]", summary: "unfolds a candidate, or one consequence", places: [2]int{3, 4},
	more:    "With a key: the figure, its formula, and indented below it the figures that go into it, down to the\nmeasured facts and cited factors, so that it can be done again by hand.",
	options: []option{againstOption, frozenOption, coresOption},
	run: func(c *call) (int, error) {
		if len(c.args.places) == 4 && !c.knownKey(c.args.places[3]) {
			if _, inGraph := c.Params.Graph.Slot(c.args.places[3]); !inGraph {
				return 0, usagef("there is no consequence %q%s", c.args.places[3], run.LikeThis(c.args.places[3], c.keyNames()))
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			if err := c.knownNames(r, c.args.places[1], c.args.places[2]); err != nil {
				return 0, err
			}
			cand, err := r.Find(c.args.places[1], c.args.places[2])
			if err != nil {
				return 0, err
			}
			snap, err := c.state(s)
			if err != nil {
				return 0, err
			}
			if len(c.args.places) == 3 {
				if c.json {
					c.printJSON(map[string]any{"study": c.args.places[0], "candidate": cand.PublicJSON()})
					return ExitDone, nil
				}
				c.candidate(cand)
				if cand.Status == run.Fitted {
					accounts, err := run.NewAccounts(c.Params, snap)
					if err != nil {
						return 0, err
					}
					l, why, err := accounts.Ledger(cand)
					if err != nil {
						return 0, err
					}
					c.say("%s", pictures.Ledger(l, why))
					saving, why, err := accounts.Saving(cand)
					if err != nil {
						return 0, err
					}
					c.say("%s", pictures.Saving(saving, why))
					c.say("%s", pictures.Densities(accounts.Values(cand)))
					life := accounts.Values(cand)("life_yr")
					for _, line := range pictures.Habitat(cand.Habitat, life.X) {
						c.say("habitat: %s", line)
					}
				}
				return ExitDone, nil
			}
			key := c.args.places[3]
			if _, ok := cand.Consequence(key); !ok && cand.Status != run.Fitted { // nothing was fitted: no figure, and no zero
				why := present.Named(cand.Status)
				if cand.Reason != "" {
					why += ": " + present.Reason(cand.Reason)
				}
				c.answer(map[string]any{"study": c.args.places[0], "site": cand.Site, "plant": cand.Plant, "key": key,
					"unfolding": map[string]any{"name": key, "unit": c.unitOf(key), "state": cand.Status, "why": why}},
					"%s of %s with %s: no figure, since no plant was fitted (%s). gtally why without the key says what stood in the way.", key, cand.Site, cand.Plant, why)
				return ExitDone, nil
			}
			u, err := run.Unfold(c.Params, snap, cand, key)
			if err != nil {
				return 0, err
			}
			var drivers []run.Driver
			var trials int
			var other *against
			if _, inGraph := c.Params.Graph.Slot(key); inGraph && cand.Status == run.Fitted {
				accounts, err := run.NewAccounts(c.Params, snap)
				if err != nil {
					return 0, err
				}
				if drivers, trials, err = accounts.Drivers(cand, key); err != nil {
					return 0, err
				}
				if other, err = c.against(r, accounts, snap, cand, key); err != nil {
					return 0, err
				}
			}
			if c.json {
				answer := map[string]any{"study": c.args.places[0], "site": cand.Site, "plant": cand.Plant, "key": key, "unfolding": u, "drivers": driversJSON(drivers), "trials": trials}
				if other != nil {
					answer["against"] = other
				}
				c.printJSON(answer)
				return ExitDone, nil
			}
			c.say("%s of %s with %s. Each figure follows by its formula from the central values one step further in.", key, cand.Site, cand.Plant)
			for _, k := range c.Params.Keys() {
				if k.Key == key && k.Sentence != "" {
					c.say("%s: %s", k.Title, k.Sentence)
				}
			}
			c.say("")
			p := &printer{c: c, cand: cand, seen: map[string]bool{}}
			p.unfold(u, 0)
			if key == "buildable_area_ha" {
				c.areas(cand)
			}
			c.sayDrivers(drivers, trials)
			if other != nil {
				c.say("")
				c.say("%s", other.words)
			}
			for _, n := range p.notices {
				c.say("notice: %s", present.Sentence(n, nil))
			}
			return ExitDone, nil
		})
	},
}

// candidate prints everything that follows from a candidate, by account.
func (c *call) candidate(cand *run.Candidate) {
	status := present.Named(cand.Status)
	if cand.Reason != "" {
		status += ": " + present.Reason(cand.Reason)
	}
	c.say("%s with %s: %s", cand.Site, cand.Plant, status)
	if m := cand.Miss; m != nil {
		line := fmt.Sprintf("nearest miss: %.2f ha buildable, largest piece %.2f ha", m.BuildableHa, m.LargestPatchHa)
		if m.NeedsPatchHa > 0 {
			line += fmt.Sprintf(", at least %.2f ha in one piece is asked for", m.NeedsPatchHa)
		}
		if m.LargestTaker != "" {
			line += fmt.Sprintf("; the rule %s takes most, %.2f ha", present.Rule(m.LargestTaker), m.TakesHa)
		}
		c.say("  %s", line)
	}
	c.areas(cand)
	if f := cand.Fit; f != nil {
		line := fmt.Sprintf("fit (%s): %s kW rated, %s kW at the terminals", present.Named(f.Mode), figure(f.RatedKW), figure(f.ACKW))
		if n := len(f.Turbines); n > 0 {
			line += fmt.Sprintf(", turbines: %d", n)
		}
		if f.FencedHa > 0 {
			line += fmt.Sprintf(", %.2f ha fenced", f.FencedHa)
		}
		if words := present.PanelDensity(cand.Technology, f.Modules, f.SolarKW, f.FencedHa); words != "" {
			line += ", " + words
		}
		if words := present.PanelRows(f.RowPitchM, f.TiltDeg); words != "" {
			line += ", " + words
		}
		c.say("  %s", line)
	}
	words, broken := pictures.Layout(cand.Fit)
	for _, line := range words {
		c.say("    %s", line)
	}
	for _, line := range broken {
		c.say("    rule not kept: %s", line)
	}
	if n := cand.Connection; n != nil {
		kv := fmt.Sprintf("%g kV", n.VoltageKV)
		if n.Reason == "voltage_unknown" {
			kv += " assumed"
		}
		line := fmt.Sprintf("connection: %s, a %s of %s; %.2f km straight, %.2f km with detour; %d x %s", n.Asset, present.Named(n.Kind), kv, n.StraightKm, n.RouteKm, n.Circuits, n.Conductor)
		if n.Reason != "" {
			line += "; " + present.Reason(n.Reason)
		}
		if n.SpareKW != nil {
			line += fmt.Sprintf("; spare capacity %s kW", figure(*n.SpareKW))
		}
		if n.ToldBy != "" {
			line += fmt.Sprintf(", told by %s %s", n.ToldBy, n.ToldOn)
		}
		c.say("  %s", line)
		if words := pictures.Together(n); words != "" {
			c.say("  %s", words)
		}
	}
	c.chain(cand, "", "  ")
	for _, a := range scoring.Accounts() {
		rows := [][]string{}
		for _, q := range cand.All() {
			if q.Account != a {
				continue
			}
			unit, more := "", present.Span(q)
			switch q.State {
			case scoring.Number, scoring.Class:
				unit = unitWords(q.Unit)
			case scoring.Never, scoring.NotAssessed:
			default:
				if q.Why != "" {
					more = present.Reason(q.Why)
				}
			}
			rows = append(rows, []string{"  " + q.Key, present.Cell(q), unit, more})
		}
		if len(rows) > 0 {
			c.say("account %s", a)
			columns(c.out, rows, map[int]bool{1: true})
		}
	}
	for _, k := range cand.OverLimit {
		c.say("OVER THE LIMIT: %s", k)
	}
	for _, k := range cand.Incomplete {
		c.say("incomplete: computed without %s, which is not set", missingRule(k))
	}
	for _, n := range cand.Notices {
		c.say("notice: %s", present.Sentence(n, nil))
	}
	c.say("A typical year has 8,760 hours.")
}

// areas prints how the site's area is parted: the parts add up to the gross area.
func (c *call) areas(cand *run.Candidate) {
	gross, okG := cand.Consequence("gross_area_ha")
	buildable, okB := cand.Consequence("buildable_area_ha")
	if !okG || !okB || gross.State != scoring.Number || buildable.State != scoring.Number {
		return
	}
	ha := func(x float64) string { return fmt.Sprintf("%.2f", x) }
	rows := [][]string{{"  site", ha(gross.Central), "ha", ""}}
	for _, t := range cand.Taken {
		more := ""
		if t.SharedHa > 0 {
			more = fmt.Sprintf("and %s ha that other rules take too", ha(t.SharedHa))
		}
		if t.TakesAll {
			more += "; it would take the whole site"
		}
		rows = append(rows, []string{"  taken by " + present.Rule(t.Rule) + " alone", ha(-t.AloneHa), "ha", strings.TrimPrefix(more, "; ")})
	}
	rows = append(rows, []string{"  taken by several rules", ha(-cand.TakenSharedHa), "ha", ""}, []string{"  too small or too narrow", ha(-cand.ShapeHa), "ha", ""}, []string{"  buildable", ha(buildable.Central), "ha", ""})
	for _, r := range rows {
		r[1] = strings.Replace(r[1], "-0.00", "0.00", 1)
	}
	columns(c.out, rows, map[int]bool{1: true})
}

// chain prints the loss chain; with a unit only the steps in it.
func (c *call) chain(cand *run.Candidate, unit, pad string) {
	rows := [][]string{}
	last := ""
	for _, st := range cand.Chain {
		if unit != "" && st.Unit != unit {
			continue
		}
		if st.Unit != last {
			rows = append(rows, []string{pad + "before losses", figure(st.Before), st.Unit, ""})
			last = st.Unit
		}
		rows = append(rows, []string{pad + present.Step(st.Name), figure(st.After), st.Unit, percent(-st.Share)})
	}
	columns(c.out, rows, map[int]bool{1: true, 3: true})
}

// percent writes a share with its sign; what rounds to nothing has none.
func percent(share float64) string {
	s := fmt.Sprintf("%+.2f %%", 100*share)
	if s == "-0.00 %" || s == "+0.00 %" {
		return "0.00 %"
	}
	return s
}

// printer prints a tree of formulas, each quantity once and each notice once, at the end.
type printer struct {
	c       *call
	cand    *run.Candidate
	seen    map[string]bool
	notices []string
}

func (p *printer) unfold(u *run.Unfolding, depth int) {
	pad := strings.Repeat("  ", depth)
	line := pad + u.Name + " = "
	if u.State == "number" {
		line += strings.TrimSpace(figure(u.Value) + " " + unitWords(u.Unit))
	} else {
		line += u.State
	}
	if u.Range != "" {
		line += fmt.Sprintf("  (%s to %s: %s)", figure(u.Low), figure(u.High), rangeWords(u.Range))
	}
	if u.Why != "" {
		line += "  (" + present.Reason(u.Why) + ")"
	}
	if p.seen[u.Name] && len(u.Inputs) > 0 {
		p.c.say("%s  unfolded above", line)
		return
	}
	if u.Title != "" && u.Title != strings.ReplaceAll(u.Name, "_", " ") {
		line += "  " + u.Title
	}
	p.c.say("%s", line)
	repeated := p.seen[u.Name]
	p.seen[u.Name] = true
	for _, n := range u.Notices {
		if !slices.Contains(p.notices, n) {
			p.notices = append(p.notices, n)
		}
	}
	if repeated {
		return
	}
	if u.Formula != "" {
		p.c.say("%s    formula: %s", pad, u.Formula)
	}
	if u.Source != "" {
		more := ""
		if u.Provenance != "" {
			more = " (" + present.Provenance(u.Provenance) + ")"
		}
		p.c.say("%s    source: %s%s", pad, u.Source, more)
	}
	switch u.Name { // figures of the fit, whose steps are the loss chain
	case "wind_p50_mwh":
		p.c.chain(p.cand, "MWh/yr", pad+"    ")
	case "solar_p50_mwh":
		p.c.chain(p.cand, "kWh/kWp", pad+"    ")
		if f := p.cand.Fit; f != nil && f.SolarKW > 0 {
			p.c.say("%s    times %s kWp", pad, figure(f.SolarKW))
		}
	}
	for _, in := range u.Inputs {
		p.unfold(in, depth+1)
	}
}

// missingRule names a rule or a limit that the user has not entered.
func missingRule(name string) string {
	if strings.Contains(name, ".") {
		return name
	}
	return present.Rule(name)
}

// rangeWords says what the range of an unfolded figure means.
func rangeWords(r string) string {
	if r == "p5_p95" {
		return "P5 to P95 of the factor"
	}
	return present.RangeWords(scoring.Range(r))
}
