package run

import (
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/scoring"
)

// ownerConsent is the gate whose state comes with the parcels.
const ownerConsent = "owner_consent"

// criticalPrefix stands before the name of a stock in the setting that declares it critical.
const criticalPrefix = "gate.critical."

// Stock is something living or grown over ages that a study can declare critical: a candidate that touches it is then
// held back.
type Stock struct {
	Name  string
	Title string
	key   string // consequence or fact: an area, none where it is known to be untouched
}

// Stocks are those that can be declared critical.
var Stocks = []Stock{
	{"peat", "mapped peat", "peat_ha"},
	{"irreplaceable_habitat", "irreplaceable habitat", "habitat_irreplaceable_ha"},
	{"habitat", "mapped habitat", "habitat_ha"},
	{"forest", "forest", "forest_ha"},
	{"farmland", "farmland", "farmland_quality_ha"},
}

// GateTitle names a gate for people.
func GateTitle(name string) string {
	if name == ownerConsent {
		return "owner's consent"
	}
	for _, s := range Stocks {
		if s.Name == name {
			return s.Title + " untouched"
		}
	}
	return name
}

// Gate gives the state of a gate. A stock is untouched (yes), touched (no), or unknown.
func (c *Candidate) Gate(name string) Gate {
	for _, s := range Stocks {
		if s.Name != name {
			continue
		}
		switch q := c.stateOf(s.key); q.State {
		case scoring.Number:
			if q.X >= sliverHa {
				return Gate{State: "no"}
			}
			return Gate{State: "yes"}
		case scoring.None:
			return Gate{State: "yes"}
		}
		return Gate{State: "unknown"}
	}
	return c.Gates[name]
}

// AllGates gives the state of every gate of a fitted candidate, in force or not.
func (c *Candidate) AllGates() map[string]Gate {
	out := map[string]Gate{}
	for name, g := range c.Gates {
		out[name] = g
	}
	if c.Status == Fitted {
		for _, s := range Stocks {
			out[s.Name+"_untouched"] = c.Gate(s.Name)
		}
	}
	return out
}

// stateOf gives a consequence or a fact by name.
func (c *Candidate) stateOf(name string) scoring.Value {
	if q, ok := c.Consequence(name); ok {
		return scoring.Value{State: q.State, X: q.Central, Why: q.Why}
	}
	if c.columns != nil {
		return c.columns.fact(c.row, name)
	}
	for _, l := range c.Facts {
		if l.Name == name {
			return scoring.Value{State: l.State, X: l.X, Why: l.Why}
		}
	}
	return scoring.UnknownBecause("no_such_quantity")
}

// fact gives one fact of a row.
func (c *Columns) fact(row int, name string) scoring.Value {
	b, row := c.blocks[row/blockRows], row%blockRows
	i := slices.Index(c.facts, name)
	if i < 0 || !b.hasFacts[row] {
		return scoring.UnknownBecause("no_such_quantity")
	}
	n, x, _ := b.facts[i].get(row)
	f := &c.forms[n]
	return scoring.Value{State: f.state, X: x, Why: f.why}
}

// gateRule is a gate that is in force: not_no holds back a no, yes holds back all but a yes.
type gateRule struct{ name, mode string }

// gatesOf lists the gates in force, owner's consent first.
func gatesOf(snap *study.Snapshot) []gateRule {
	var out []gateRule
	add := func(name, key string) {
		if mode := snap.Text(key); mode == "not_no" || mode == "yes" {
			out = append(out, gateRule{name, mode})
		}
	}
	add(ownerConsent, "gate."+ownerConsent)
	for _, s := range Stocks {
		add(s.Name, criticalPrefix+s.Name)
	}
	return out
}

// heldBy names the gates that hold a candidate back.
func heldBy(gates []gateRule, c *Candidate) []string {
	var out []string
	for _, g := range gates {
		if state := c.Gate(g.name).State; state == "no" && g.mode == "not_no" || state != "yes" && g.mode == "yes" {
			out = append(out, g.name)
		}
	}
	return out
}

// Held is a candidate that gates hold back, with the place that it would take if no gate held anything back.
type Held struct {
	Site  string   `json:"site"`
	Plant string   `json:"plant"`
	Gates []string `json:"gates"`
	Place int      `json:"place_without_gates"`
	Tier  int      `json:"tier_without_gates"`
	Score float64  `json:"score"`
}

// By names the gates that hold it back, for people.
func (h Held) By() string {
	titles := make([]string, len(h.Gates))
	for i, g := range h.Gates {
		titles[i] = GateTitle(g)
	}
	return strings.Join(titles, ", ")
}

// ID names the candidate.
func (h Held) ID() string { return h.Site + "/" + h.Plant }
