package run

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
	"groundtally/scoring/energy"
	"groundtally/scoring/units"
	"groundtally/scoring/weigh"
)

// The alternatives that stand beside the candidates.
const (
	SavingTheSame = "saving"
	SealedGround  = "sealed_ground"
)

// Alternative is another way to the same end that stands beside the candidates in table and order. It competes for no
// place: what saves energy spares every burden and would come before any plant.
type Alternative struct {
	ID           string                `json:"id"`
	Title        string                `json:"title"`
	About        string                `json:"about"`             // what it stands for
	Unknown      string                `json:"unknown,omitempty"` // a code: why nothing is known of it
	Consequences []scoring.Consequence `json:"-"`
}

// Consequence finds a consequence by key; of an alternative that is not known it is unknown for the same reason.
func (a *Alternative) Consequence(key string) scoring.Consequence {
	for _, q := range a.Consequences {
		if q.Key == key {
			return q
		}
	}
	return scoring.Consequence{Key: key, State: scoring.Unknown, Why: a.Unknown}
}

// PublicJSON gives the alternative as terminal and appendix write it.
func (a *Alternative) PublicJSON() map[string]any {
	cons := make(map[string]any, len(a.Consequences))
	for _, q := range a.Consequences {
		cons[q.Key] = ConsequenceJSON(q)
	}
	m := map[string]any{"id": a.ID, "title": a.Title, "about": a.About, "consequences": cons}
	if a.Unknown != "" {
		m["unknown"] = a.Unknown
	}
	return m
}

// Beside is an alternative under the weights of a voice.
type Beside struct {
	ID        string       `json:"id"`
	Title     string       `json:"title"`
	About     string       `json:"about"`
	Why       string       `json:"unknown_because,omitempty"` // a code; then there is no score
	Place     int          `json:"would_take_place,omitempty"`
	Score     float64      `json:"score"`
	ScoreLow  float64      `json:"score_low"`
	ScoreHigh float64      `json:"score_high"`
	Parts     []BesidePart `json:"parts,omitempty"`
	Unknown   []string     `json:"unknown"`
}

// BesidePart is one key's part of the score of an alternative.
type BesidePart struct {
	Key    string  `json:"key"`
	Weight float64 `json:"weight"`
	Part
}

// alternatives lists what stands beside the candidates: saving the same and sealed ground; doing nothing is an item of
// the order itself.
func (r *Results) alternatives(snap *study.Snapshot, p *Params) error {
	saving, err := r.savingTheSame(snap, p)
	if err != nil {
		return err
	}
	r.Alternatives = []Alternative{saving, r.sealed}
	return nil
}

// energyKeys are what a saving gives just as the plant that it equals.
var energyKeys = []string{"energy_p50_mwh_per_yr", "energy_p50_adjusted_mwh_per_yr", "energy_p75_mwh_per_yr", "energy_p90_mwh_per_yr", "energy_p99_mwh_per_yr", "delivered_mwh_per_yr", "demand_share_frac", "households_equiv", "human_power_persons", "displaced_tco2e_per_yr"}

// equalled gives the candidate whose energy the row of saving equals: the one the user named, else the middle one by
// delivered energy, the lower of two.
func (r *Results) equalled(snap *study.Snapshot) (c *Candidate, about, why string) {
	if id := strings.TrimSpace(snap.Text("saving.same_as")); id != "" && id != study.NotSetText {
		site, plant, _ := strings.Cut(id, "/")
		c, err := r.Find(site, plant)
		if err != nil {
			return nil, "", "no_such_candidate"
		}
		if c.Status != Fitted {
			return nil, "", c.Status
		}
		return c, fmt.Sprintf("as much energy as %s with %s", c.Site, c.Plant), ""
	}
	if c := r.middle("delivered_mwh_per_yr", ""); c != nil {
		return c, fmt.Sprintf("as much energy as %s with %s, the middle candidate by energy", c.Site, c.Plant), ""
	}
	return nil, "", "no_energy_known"
}

// savingTheSame gives the consequences of using so much less that a plant is not needed.
func (r *Results) savingTheSame(snap *study.Snapshot, p *Params) (Alternative, error) {
	out := Alternative{ID: SavingTheSame, Title: "Saving the same"}
	c, about, why := r.equalled(snap)
	if c == nil {
		out.Unknown = why
		return out, nil
	}
	s, why, err := (&Accounts{k: r.reckoner, snap: snap}).Saving(c)
	if err != nil {
		return out, err
	}
	if s == nil {
		out.Unknown = why
		return out, nil
	}
	out.About = about
	for _, k := range p.Keys() {
		q := scoring.Consequence{Key: k.Key, Account: k.Account, Unit: k.Unit, State: scoring.NotAssessed, Quality: "follows from the plant that it equals"}
		crit, known := snap.Catalog().Criterion(strings.TrimSuffix(k.Key, criteria.BurdenSuffix))
		switch {
		case slices.Contains(energyKeys, k.Key):
			q, _ = c.Consequence(k.Key)
		case k.Key == "saving_equivalent_mwh_per_yr":
			q = corners(q, s.Equal.Direct.Low.MWhPerYr, s.Equal.Direct.Central.MWhPerYr, s.Equal.Direct.High.MWhPerYr)
		case k.Key == "eroi_extended" || k.Key == netShareKey:
			if !s.in.InvestmentKnown {
				q.State, q.Why = notSet("saving.investment_mj_per_mwh")
			} else if s.in.InvestmentMJPerMWh.Central > 0 {
				ends := s.returns(k.Key)
				q = corners(q, ends[0], ends[1], ends[2])
			}
		case k.Key == "ghg_g_per_kwh":
			if g, ok := snap.Number("saving.investment_g_per_kwh"); ok {
				q = corners(q, g*s.perDelivered(0), g*s.perDelivered(1), g*s.perDelivered(2))
			} else {
				q.State, q.Why = notSet("saving.investment_g_per_kwh")
			}
		case k.Account == scoring.Climate || known && crit.Account == scoring.Energy:
		case known && (crit.Better == criteria.Less || crit.Better == criteria.More && !brings(crit)):
			q.State, q.Why = scoring.None, "nothing is built"
		}
		out.Consequences = append(out.Consequences, q)
	}
	return out, nil
}

func notSet(setting string) (scoring.State, string) {
	v := scoring.NotSetKey(setting)
	return v.State, v.Why
}

// corners sets a consequence to numbers whose range takes all inputs at one end.
func corners(q scoring.Consequence, a, central, b float64) scoring.Consequence {
	q.State, q.Why = scoring.Number, ""
	q.Low, q.Central, q.High, q.Median, q.Range = math.Min(a, b), central, math.Max(a, b), central, scoring.Corners
	if q.Low == q.High {
		q.Range = scoring.NoRange
	}
	return q
}

// sealedReason stands where roofs and sealed ground take nothing.
const sealedReason = "no living ground is taken"

// sealedGround reckons panels on all mapped roofs and sealed ground as one plant that takes no land and feeds in where
// the buildings are connected. Sites are those of the results, whose yield it takes where none is typed.
func (w *world) sealedGround(k *reckoner, r *Results) (Alternative, error) {
	out := Alternative{ID: SealedGround, Title: "Roofs and sealed ground"}
	layers := w.byRole[SealedGround]
	if len(layers) == 0 {
		out.Unknown = "no_layer:" + SealedGround
		return out, nil
	}
	perHa, ok := w.snap.Number("sealed.kw_per_ha")
	if !ok {
		out.Unknown = "not_set:sealed.kw_per_ha"
		return out, nil
	}
	all, usable, assumed := 0.0, 0.0, false
	for _, l := range layers {
		for i, g := range l.xy {
			if g.Kind != geo.Polygons {
				continue
			}
			ha := measure.AreaM2(g) / units.M2PerHa
			share, known := l.number(i, "usable_share", "1")
			if !known {
				if share, known = w.snap.Number("sealed.usable_share"); !known {
					out.Unknown = "not_set:sealed.usable_share"
					return out, nil
				}
				assumed = true
			}
			all += ha
			usable += float64(ha * math.Min(1, math.Max(0, share)))
		}
	}
	kw := usable * perHa
	if kw == 0 {
		out.Unknown = "nothing_found:" + SealedGround
		return out, nil
	}
	sun := r.middle("specific_yield_kwh_per_kw", "solar")
	perKW, typed := w.snap.Number("sealed.kwh_per_kw")
	fit := fitResult{SolarKW: kw, SolarACKW: kw}
	switch {
	case typed:
	case sun == nil:
		out.Unknown = "not_set:sealed.kwh_per_kw"
		return out, nil
	default:
		q, _ := sun.Consequence("specific_yield_kwh_per_kw")
		perKW = q.Central
	}
	if sun != nil {
		s := sigmas(sun)
		fit.SolarShared, fit.SolarOwn = s.SolarShared, s.SolarOwn
	}
	out.About = fmt.Sprintf("panels of %.0f kW on %.3g ha of mapped roofs and sealed ground, of which %.3g ha are taken as usable; the strength of roofs and their own connections are not looked at", kw, all, usable)
	if assumed {
		out.About += "; where the layer says no usable share, that of the study counts"
	}

	v := slices.Clone(k.central)
	set := func(name string, x scoring.Value) {
		if slot, ok := k.p.Graph.Slot(name); ok {
			v[slot] = x
		}
	}
	for _, name := range k.p.facts { // of what such a plant has none of there is nothing; the rest follows
		set(name, scoring.Num(0))
	}
	for _, name := range []string{"habitat_ha", "habitat_irreplaceable_ha", "habitat_fragments", "forest_ha", "flood_ha", "water_protection_ha", "sensitive_ha", "farmland_quality_ha", "peat_ha", "track_km"} {
		set(name, scoring.NoneBecause(sealedReason))
	}
	for _, name := range []string{"nearest_dwelling_m", "heritage_m", "sensitive_m", "height_limit_m", "road_m", "gross_area_ha", "buildable_area_ha", "largest_patch_ha", "connection_spare_kw", "connection_route_rise_frac", "used_at_once_share", "performance_ratio_frac", "crop_light_frac", "wake_loss_frac"} {
		set(name, scoring.Value{State: scoring.NotAssessed})
	}
	mwh := kw * perKW / units.KWhPerMWh
	set("solar_kw", scoring.Num(kw))
	set("solar_ac_kw", scoring.Num(kw))
	set("ac_kw", scoring.Num(kw))
	set("solar_p50_mwh", scoring.Num(mwh))
	set("solar_load_factor", scoring.Num(mwh*units.KWhPerMWh/(kw*units.HoursPerYear)))
	set("wind_yield_error", scoring.Num(1))
	set("solar_yield_error", scoring.Num(1))
	set("solar_yield_sigma", scoring.Num(math.Hypot(fit.SolarShared, fit.SolarOwn)))
	k.p.Graph.Central(v)
	spreads, err := k.p.Graph.Trials(v, k.draws(SealedGround, fit, v), k.want)
	if err != nil {
		return out, fmt.Errorf("roofs and sealed ground: %w", err)
	}
	c := &Candidate{Technology: "solar_fixed"}
	k.fill(c, v, spreads, k.leafNotices(fit, link{}, laid{}))
	for i := range c.Consequences {
		q := &c.Consequences[i]
		switch {
		case q.Account == scoring.Land, q.Account == scoring.Neighbours && q.State == scoring.Number:
			*q = scoring.Consequence{Key: q.Key, Account: q.Account, Unit: q.Unit, State: scoring.None, Why: sealedReason}
			if q.Account == scoring.Neighbours {
				q.State, q.Why = scoring.NotAssessed, ""
			}
		case q.Account == scoring.Grid:
			*q = scoring.Consequence{Key: q.Key, Account: q.Account, Unit: q.Unit, State: scoring.NotAssessed}
			if q.Key == "connection_km" || q.Key == "connection_straight_km" || q.Key == "connection_crossings" {
				q.State, q.Why = scoring.None, "it feeds in where the buildings are connected"
			}
		}
	}
	out.Consequences = c.Consequences
	return out, nil
}

// middle gives the fitted candidate with the median of a consequence, the lower of two, among those whose technology
// begins as given; nil without any.
func (r *Results) middle(key, technology string) *Candidate {
	type one struct {
		at int
		x  float64
	}
	var all []one
	for i := range r.Candidates {
		c := &r.Candidates[i]
		if c.Status != Fitted || !strings.HasPrefix(c.Technology, technology) {
			continue
		}
		if q, ok := c.Consequence(key); ok && q.State == scoring.Number {
			all = append(all, one{i, q.Central})
		}
	}
	if len(all) == 0 {
		return nil
	}
	slices.SortFunc(all, func(a, b one) int { return cmp.Or(cmp.Compare(a.x, b.x), cmp.Compare(a.at, b.at)) })
	return &r.Candidates[all[(len(all)-1)/2].at]
}

// besides weighs the alternatives under the scales of a voice. Scores are those of what is ordered, from the first.
func besides(all []Alternative, sc []scale, raw []float64, scores []float64) ([]Beside, error) {
	w, err := weigh.Swing(raw)
	if err != nil {
		return nil, err
	}
	out := []Beside{}
	for i := range all {
		a := &all[i]
		b := Beside{ID: a.ID, Title: a.Title, About: a.About, Why: a.Unknown, Unknown: []string{}}
		if a.Unknown == "" {
			for k, s := range sc {
				if w[k] == 0 {
					continue
				}
				part, err := s.part(a.Consequence(s.key), false)
				if err != nil {
					return nil, fmt.Errorf("%s, %s: %w", a.Title, s.key, err)
				}
				one := BesidePart{Key: s.key, Weight: w[k], Part: Part{Known: part.Known, Weight: w[k]}}
				low, mid, high := 0.0, 0.5, 1.0 // as an order counts what is not known
				if part.Known {
					low, mid, high = part.Low, part.Mid, part.High
					one.Value = mid
				} else {
					b.Unknown = append(b.Unknown, s.key)
				}
				one.Share, one.ShareLow, one.ShareHigh = float64(w[k]*mid), float64(w[k]*low), float64(w[k]*high)
				b.Score += one.Share
				b.ScoreLow += one.ShareLow
				b.ScoreHigh += one.ShareHigh
				b.Parts = append(b.Parts, one)
			}
			b.Place = 1
			for _, x := range scores {
				if x > b.Score {
					b.Place++
				}
			}
		}
		out = append(out, b)
	}
	return out, nil
}

// Saving is what saving would equal a candidate.
type Saving struct {
	Equal energy.SavingEquals
	in    energy.Saving
}

// perDelivered gives how much is saved at the place of use for each unit that the plant would deliver, at the friendly
// (0), central (1) and unfriendly (2) end.
func (s *Saving) perDelivered(end int) float64 {
	loss, direct := s.in.DistributionLossFrac, s.in.DirectRebound
	λ := [3]float64{loss.High, loss.Central, loss.Low}[end]
	ρ := [3]float64{direct.Low, direct.Central, direct.High}[end]
	return (1 - λ) / (1 - ρ)
}

// returns gives the return of a saving on the energy spent on it, or the share left, at the three ends. What is spent
// must be known and above zero.
func (s *Saving) returns(key string) (out [3]float64) {
	for end := range out {
		spent := s.in.InvestmentMJPerMWh.Central * s.perDelivered(end) / units.MJPerMWh // primary, for each unit of electricity
		if out[end] = 1 / spent; key == netShareKey {
			out[end] = 1 - float64(s.in.GridEfficiency*spent)
		}
	}
	return out
}

// Saving reckons the saving at the place of use that would do the same as a fitted candidate, with direct and
// economy-wide rebound; why tells in a code why there is none.
func (a *Accounts) Saving(c *Candidate) (out *Saving, why string, err error) {
	if c.Status != Fitted {
		return nil, c.Status, nil
	}
	delivered, ok := c.Consequence("delivered_mwh_per_yr")
	if !ok || delivered.State != scoring.Number {
		return nil, cmp.Or(delivered.Why, "no_energy_known"), nil
	}
	in, err := a.savingOf(delivered.Central)
	if err != nil {
		return nil, "", err
	}
	out = &Saving{in: in}
	if x, ok := a.snap.Number("saving.investment_mj_per_mwh"); ok {
		net, life := a.Values(c)("net_energy_gwh_life"), a.Values(c)("life_yr")
		if net.OK() && life.OK() && life.X > 0 {
			out.in.InvestmentKnown, out.in.InvestmentMJPerMWh = true, energy.Span{Low: x, Central: x, High: x}
			out.in.NetMWhPerYr = net.X * units.MJPerGWh / units.MJPerMWh / life.X
		}
	}
	out.Equal, err = out.in.Equal()
	return out, "", err
}

// savingOf describes the saving of some delivered energy a year under the study's factors, its own investment left out.
func (a *Accounts) savingOf(deliveredMWhPerYr float64) (energy.Saving, error) {
	out := energy.Saving{DeliveredMWhPerYr: deliveredMWhPerYr, GridEfficiency: a.k.gridEfficiency()}
	for _, s := range []struct {
		id string
		to *energy.Span
	}{{"distribution_loss_frac", &out.DistributionLossFrac}, {"rebound_frac", &out.DirectRebound}, {"rebound_economy_frac", &out.EconomyRebound}} {
		f, _, err := a.k.factor(s.id)
		if err != nil {
			return out, err
		}
		*s.to = energy.Span{Low: f.Low, Central: f.Central, High: f.High}
	}
	return out, nil
}
