package run

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/scoring"
	"groundtally/scoring/climate"
	"groundtally/scoring/energy"
	"groundtally/scoring/reckon"
	"groundtally/scoring/units"
)

// Accounts tells of single candidates what stands behind their consequences: the values of all quantities, which
// factors matter, and how often one comes out ahead of another.
type Accounts struct {
	k    *reckoner
	snap *study.Snapshot
}

// NewAccounts prepares the accounts of a study.
func NewAccounts(p *Params, snap *study.Snapshot) (*Accounts, error) {
	k, err := (&world{snap: snap, p: p}).newReckoner()
	if err != nil {
		return nil, err
	}
	return &Accounts{k, snap}, nil
}

// Values gives the central values of quantities, facts, factors and settings by name, for a fitted candidate.
func (a *Accounts) Values(c *Candidate) func(name string) scoring.Value {
	v := a.k.vector(c)
	return func(name string) scoring.Value {
		slot, ok := a.k.p.Graph.Slot(name)
		switch {
		case !ok:
			return scoring.UnknownBecause("no_such_quantity")
		case c.Status != Fitted:
			return scoring.UnknownBecause(c.Status)
		}
		return v[slot]
	}
}

// Driver is a group of factors, or the error of a yield, with how strongly a consequence follows it.
type Driver struct {
	Name  string
	Title string
	Rho   float64 // Spearman's rank correlation over the trials, -1 to 1
	Known bool    // false where one of the two does not vary
}

// Drivers ranks what a consequence of a fitted candidate follows, strongest first, over the trials in which it is a
// number.
func (a *Accounts) Drivers(c *Candidate, key string) (out []Driver, trials int, err error) {
	if c.Status != Fitted {
		return nil, 0, nil
	}
	result, groups, titles, err := a.trials(c, key)
	if err != nil {
		return nil, 0, err
	}
	ranked, used, err := reckon.Influences(groups, result)
	if err != nil {
		return nil, 0, err
	}
	for _, r := range ranked {
		out = append(out, Driver{Name: r.Group, Title: titles[r.Group], Rho: r.Rho, Known: r.Known})
	}
	return out, used, nil
}

// trials gives a consequence in every trial, and the draws of the groups that it can depend on.
func (a *Accounts) trials(c *Candidate, key string) (result []scoring.Value, groups []reckon.GroupDraw, titles map[string]string, err error) {
	g := a.k.p.Graph
	slot, ok := g.Slot(key)
	if !ok {
		return nil, nil, nil, fmt.Errorf("there is no consequence %q: %w", key, study.ErrNotThere)
	}
	reach := g.Reaches(key)
	central := a.k.vector(c)
	drawn := a.k.draws(c.Site, sigmas(c), central)
	titles = map[string]string{}
	for _, d := range drawn {
		// Of what a plant has none of, the price does not matter, and a chance correlation would mislead.
		if !slices.Contains(reach, d.Slot) || !moves(g, central, d, slot) {
			continue
		}
		leaf := g.Leaves()[d.Slot]
		name := leaf.Name
		if f, ok := a.k.p.Factor(a.snap, leaf.Name); ok && f.Group != "" {
			name = f.Group
		}
		title := factorWords.Replace(leaf.Title)
		if t, there := titles[name]; there {
			titles[name] = t + "; " + title
			continue
		}
		// All factors of a group rise with one draw, so that one of them has its ranks.
		titles[name] = title
		groups = append(groups, reckon.GroupDraw{Group: name, Values: d.Values})
	}
	for _, row := range g.Samples(central, drawn, []int{slot}, a.k.trials) {
		result = append(result, row[0])
	}
	return result, groups, titles, nil
}

// factorWords turns what an inventory row counts into words.
var factorWords = strings.NewReplacer(".mj", ", energy spent", ".kgco2e", ", greenhouse gas")

// moves reports whether a result changes between the least and the greatest draw of a leaf, all else central.
func moves(g *reckon.Graph, central []scoring.Value, d reckon.Drawn, slot int) bool {
	at := func(x float64) scoring.Value {
		v := slices.Clone(central)
		v[d.Slot] = scoring.Num(x)
		g.Central(v)
		return v[slot]
	}
	return at(slices.Min(d.Values)) != at(slices.Max(d.Values))
}

// Beats gives how often, over trials that share what errs alike, the first of two fitted candidates is the better one
// in a consequence.
func (a *Accounts) Beats(one, other *Candidate, key string, more bool) (reckon.Duel, error) {
	if one.Status != Fitted || other.Status != Fitted {
		return reckon.Duel{}, nil
	}
	x, _, _, err := a.trials(one, key)
	if err != nil {
		return reckon.Duel{}, err
	}
	y, _, _, err := a.trials(other, key)
	if err != nil {
		return reckon.Duel{}, err
	}
	return reckon.Beats(x, y, more)
}

// Swapped is a factor at one value of which two candidates change places.
type Swapped struct {
	Name, Title, Unit  string
	At                 float64 // there they are equal
	Low, Central, High float64 // of the factor
}

// Swaps lists the factors that change which of two fitted candidates has the better value of a consequence, somewhere
// between their low and high, all else at its central value; by how far that is from central, the nearest first.
func (a *Accounts) Swaps(one, other *Candidate, key string) ([]Swapped, error) {
	g := a.k.p.Graph
	slot, ok := g.Slot(key)
	if !ok {
		return nil, fmt.Errorf("there is no consequence %q: %w", key, study.ErrNotThere)
	}
	if one.Status != Fitted || other.Status != Fitted {
		return nil, nil
	}
	x, y := a.k.vector(one), a.k.vector(other)
	if !x[slot].OK() || !y[slot].OK() {
		return nil, nil
	}
	var out []Swapped
	for _, at := range g.Reaches(key) {
		leaf := g.Leaves()[at]
		if leaf.Kind != scoring.FactorLeaf {
			continue
		}
		f, _, err := a.k.factor(leaf.Name)
		if err != nil {
			return nil, err
		}
		if !(f.Low < f.High) || !x[at].OK() || !y[at].OK() {
			continue
		}
		v := [2][]scoring.Value{slices.Clone(x), slices.Clone(y)}
		missing := false
		advantage := func(value float64) (float64, error) {
			for _, one := range v {
				one[at] = scoring.Num(value)
				g.Central(one)
				missing = missing || !one[slot].OK()
			}
			return v[0][slot].X - v[1][slot].X, nil
		}
		// A payback that never comes, or what is not known, has no place in a comparison of numbers.
		found, there, err := energy.SwapWithin(f.Low, f.High, advantage)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", leaf.Name, err)
		}
		if there && !missing {
			out = append(out, Swapped{Name: leaf.Name, Title: factorWords.Replace(leaf.Title), Unit: leaf.Unit, At: found, Low: f.Low, Central: f.Central, High: f.High})
		}
	}
	far := func(s Swapped) float64 { return awayFrom(s.Central, s.Low, s.High, s.At) }
	slices.SortStableFunc(out, func(p, q Swapped) int { return cmp.Compare(far(p), far(q)) })
	return out, nil
}

// gridFactors are the settings of the power that may be displaced, in the order in which they are shown.
var gridFactors = []struct{ setting, name string }{
	{"climate.grid_factor_g_per_kwh", "your factor"},
	{"climate.grid_factor_average_g_per_kwh", "average of the grid"},
	{"climate.grid_factor_marginal_g_per_kwh", "marginal plant"},
}

// PaybackLines gives what a fitted candidate displaces less what it causes, year by year, under each grid factor that
// the user entered. why tells in a code why there is none.
//
// The band joins the P10 and P90 of what is caused and delivered with the low and high of the displacement share: corners,
// wider than percentiles would be.
func (a *Accounts) PaybackLines(c *Candidate) (lines []climate.Line, why string, err error) {
	if c.Status != Fitted {
		return nil, c.Status, nil
	}
	value := a.Values(c)
	in := climate.LineInput{}
	for _, v := range []struct {
		name  string
		scale float64
		to    *climate.Span
	}{{"ghg_life_tco2e", 1, &in.CausedTCO2e}, {"delivered_mwh_per_yr", units.KWhPerMWh, &in.FirstYearKWh}} {
		q, ok := c.Consequence(v.name)
		if !ok || q.State != scoring.Number {
			return nil, q.Why, nil
		}
		*v.to = climate.Span{Low: q.Low * v.scale, Central: q.Central * v.scale, High: q.High * v.scale}
	}
	for _, v := range []struct {
		name string
		to   *float64
	}{{"ageing_per_yr", &in.DegradationPerYr}, {"life_yr", &in.LifeYr}} {
		x := value(v.name)
		if !x.OK() {
			return nil, x.Why, nil
		}
		*v.to = x.X
	}
	share, _ := a.snap.Number("climate.displacement_share")
	in.DisplacedShare = climate.Span{Low: share, Central: share, High: share}
	if x, ok := a.snap.Number("climate.displacement_share_low"); ok {
		in.DisplacedShare.Low = min(x, share)
	}
	if x, ok := a.snap.Number("climate.displacement_share_high"); ok {
		in.DisplacedShare.High = max(x, share)
	}
	decline, _ := a.snap.Number("climate.grid_decline_per_yr")
	var grids []climate.NamedGrid
	for _, f := range gridFactors {
		if x, ok := a.snap.Number(f.setting); ok {
			grids = append(grids, climate.NamedGrid{Name: fmt.Sprintf("%s, %g g/kWh", f.name, x), Grid: climate.Grid{KgPerKWh: x / units.GPerKg, DeclinePerYr: decline}})
		}
	}
	if len(grids) == 0 {
		return nil, "not_set:climate.grid_factor_g_per_kwh", nil
	}
	lines, err = climate.Lines(in, grids)
	return lines, "", err
}
