package term

import (
	"math"
	"slices"
	"strconv"
	"strings"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// most steps of a sweep.
const maxSweep = 200

var verbLeft = verb{
	name: "left", usage: "left STUDY.gpkg [--plant ID] [--sweep KEY=FROM:TO:STEP] [--to FILE [--replace]] [--top N]", summary: "land left in the whole district, and what each rule took", places: [2]int{1, 1},
	more: "Parcels play no part: the rules of a plant option are laid over the district, and what is left is told in\nhectares and zones. With --sweep one rule takes several values; every step tells land, zones, candidates with a\nplant, their energy and the first place of each voice. --to writes the zones as a layer.",
	options: []option{{name: "plant", value: "ID", help: "only this plant option"}, {name: "sweep", value: "KEY=FROM:TO:STEP", help: "at each value of one rule; needs --plant"},
		{name: "to", value: "FILE", help: "write the zones that are left"}, replaceOption, {name: "top", value: "N", help: "list only the N largest zones (10)"}, frozenOption, coresOption},
	run: func(c *call) (int, error) {
		top, err := c.args.whole("top", 1, 10)
		if err != nil {
			return 0, err
		}
		if c.args.has("sweep") && !c.args.has("plant") {
			return 0, usagef("--sweep needs --plant ID")
		}
		if c.args.has("sweep") && c.args.has("to") {
			return 0, usagef("--to writes the zones of one state and cannot stand beside --sweep")
		}
		if err := c.freeFile(c.args.get("to")); err != nil {
			return 0, err
		}
		return c.with(func(s *study.Study) (int, error) {
			snap, err := c.state(s)
			if err != nil {
				return 0, err
			}
			plants := snap.Plants()
			if p := c.args.get("plant"); p != "" {
				if !slices.Contains(plants, p) {
					return 0, usagef("there is no plant option %q; the options are: %s", p, listed(plants))
				}
				plants = []string{p}
			}
			e, err := c.engine(s, true)
			if err != nil {
				return 0, err
			}
			if c.args.has("sweep") {
				return c.sweep(e, snap, plants[0])
			}
			var all []run.Left
			for _, p := range plants {
				list, err := e.LandLeft(c.ctx, snap, p)
				if err != nil {
					return 0, computing(err)
				}
				all = append(all, list...)
			}
			if to := c.args.get("to"); to != "" {
				if err := c.writeZones(to, all); err != nil {
					return 0, err
				}
			}
			if c.json {
				c.printJSON(map[string]any{"study": c.args.places[0], "left": all})
				return ExitDone, nil
			}
			for _, l := range all {
				c.left(l, top)
			}
			return ExitDone, nil
		})
	},
}

// left tells the land left of one option.
func (c *call) left(l run.Left, top int) {
	what := "the district"
	if l.Hull {
		what = "the hull of the parcels (the study has no district boundary)"
	}
	name := l.Plant
	if l.Part != "" {
		name += ", " + l.Part + " part"
	}
	c.say("%s: of %s ha of %s, %s ha are left in %s.", name, ha(l.DistrictHa), what, ha(l.LeftHa), counted(len(l.Zones), "zone"))
	rows := [][]string{{"rule", "takes", "alone", "shared"}, {"", "ha", "ha", "ha"}}
	for _, t := range l.Rules {
		rows = append(rows, []string{present.Rule(t.Rule), ha(t.AloneHa + t.SharedHa), ha(t.AloneHa), ha(t.SharedHa)})
	}
	columns(c.out, rows, map[int]bool{1: true, 2: true, 3: true})
	c.say("Taken by more than one rule, counted once: %s ha. Too narrow or too small: %s ha.", ha(l.SharedHa), ha(l.ShapeHa))
	if len(l.Incomplete) > 0 {
		var words []string
		for _, k := range l.Incomplete {
			words = append(words, missingRule(k))
		}
		c.say("Without rules that are not set: %s.", strings.Join(words, "; "))
	}
	for i, z := range l.Zones {
		if i == top {
			c.say("  and %s", counted(len(l.Zones)-i, "smaller zone"))
			break
		}
		c.say("  zone %d: %s ha near %s", i+1, ha(z.Ha), present.Place(z.Centre))
	}
}

// sweep tells the land left at each value of one rule.
func (c *call) sweep(e *run.Engine, snap *study.Snapshot, plant string) (int, error) {
	key, values, err := sweepValues(c.args.get("sweep"))
	if err != nil {
		return 0, err
	}
	def, ok := c.Catalog.Definition(key)
	if !ok || def.Kind != "number" || !strings.HasPrefix(key, "rule.") {
		return 0, usagef("--sweep: %q is no rule with a number; gtally get lists the rules", key)
	}
	var steps []run.Step
	err = e.Sweep(c.ctx, snap, plant, key, values, func(st run.Step) error {
		steps = append(steps, st)
		return nil
	})
	if err != nil {
		return 0, computing(err)
	}
	if c.json {
		c.printJSON(map[string]any{"study": c.args.places[0], "plant": plant, "key": key, "unit": def.Unit, "steps": steps})
		return ExitDone, nil
	}
	voices := map[string]bool{}
	for _, st := range steps {
		for v := range st.First {
			voices[v] = true
		}
	}
	head := []string{key, "left", "zones", "largest", "fitted", "delivered"}
	unit := []string{unitWords(def.Unit), "ha", "", "ha", "", "MWh/yr"}
	for _, v := range sortedKeys(voices) {
		head, unit = append(head, "first for "+v), append(unit, "")
	}
	rows := [][]string{head, unit}
	short := false
	for _, st := range steps {
		largest := "0"
		if len(st.Zones) > 0 {
			largest = ha(st.Zones[0].Ha)
		}
		energy := "unknown"
		if st.EnergyKnown > 0 || st.Fitted == 0 {
			energy = present.Figure(st.EnergyMWh, st.EnergyMWh, st.EnergyMWh)
		}
		if st.EnergyKnown < st.Fitted {
			energy, short = energy+" *", true
		}
		row := []string{figure(st.Value), ha(st.LeftHa), strconv.Itoa(len(st.Zones)), largest, strconv.Itoa(st.Fitted), energy}
		for _, v := range sortedKeys(voices) {
			first := st.First[v]
			if first == "" {
				first = "."
			}
			row = append(row, first)
		}
		rows = append(rows, row)
	}
	columns(c.out, rows, map[int]bool{0: true, 1: true, 2: true, 3: true, 4: true, 5: true})
	c.say("Delivered: energy of the first year of all candidates with a plant of this option, each by itself; they do not add up where sites share a line.")
	if short {
		c.say("* the energy of some candidates is unknown and not in the sum")
	}
	return ExitDone, nil
}

// sweepValues reads KEY=FROM:TO:STEP.
func sweepValues(text string) (key string, values []float64, err error) {
	key, span, ok := strings.Cut(text, "=")
	bits := strings.Split(span, ":")
	if !ok || len(bits) != 3 {
		return "", nil, usagef("--sweep: %q is not KEY=FROM:TO:STEP", text)
	}
	var x [3]float64
	for i, b := range bits {
		if x[i], err = strconv.ParseFloat(b, 64); err != nil || math.IsNaN(x[i]) || math.IsInf(x[i], 0) {
			return "", nil, usagef("--sweep: %q is no number", b)
		}
	}
	n := math.Floor((x[1]-x[0])/x[2] + 1e-9)
	if !(x[2] > 0) || n < 0 || n+1 > maxSweep {
		return "", nil, usagef("--sweep: from %v to %v by %v: want 1 to %d steps upwards", x[0], x[1], x[2], maxSweep)
	}
	for i := range int(n) + 1 {
		values = append(values, x[0]+float64(float64(i)*x[2]))
	}
	return key, values, nil
}

// writeZones writes the zones as a layer.
func (c *call) writeZones(to string, all []run.Left) error {
	return c.export(to, []*geo.Layer{run.ZonesLayer(all)}, false, c.args.has("replace"))
}
