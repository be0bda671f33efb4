package run

import (
	"context"
	"errors"
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
	"groundtally/scoring/criteria"
)

// Unfolding is a quantity with its formula, its inputs, sources and uncertainty, down to the leaves.
type Unfolding struct {
	Name       string       `json:"name"`
	Title      string       `json:"title,omitempty"`
	Unit       string       `json:"unit"`
	State      string       `json:"state"`
	Value      float64      `json:"value"`
	Why        string       `json:"why,omitempty"`
	Low        float64      `json:"low,omitempty"`
	High       float64      `json:"high,omitempty"`
	Range      string       `json:"range,omitempty"` // what low and high mean; of a factor p5_p95 or bounds
	Kind       string       `json:"kind"`            // quantity, fact, factor or setting
	Formula    string       `json:"formula,omitempty"`
	Source     string       `json:"source,omitempty"`
	Provenance string       `json:"provenance,omitempty"`
	Notices    []string     `json:"notices,omitempty"`
	Inputs     []*Unfolding `json:"inputs,omitempty"`
}

// Unfold opens one consequence of a candidate.
func Unfold(p *Params, snap *study.Snapshot, c *Candidate, key string) (*Unfolding, error) {
	q, ok := c.Consequence(key)
	if !ok {
		if _, inGraph := p.Graph.Slot(key); !inGraph {
			return nil, fmt.Errorf("there is no consequence %q: %w", key, study.ErrNotThere)
		}
	}
	if _, inGraph := p.Graph.Slot(key); !inGraph || c.Status != Fitted {
		if !ok { // without a plant there is no such figure
			quantity, _ := p.Graph.Quantity(key)
			return &Unfolding{Name: key, Title: quantity.Title, Unit: quantity.Unit, State: scoring.Unknown.String(), Why: c.Status, Kind: "quantity", Formula: quantity.Formula}, nil
		}
		return &Unfolding{Name: key, Unit: q.Unit, State: q.State.String(), Value: q.Central, Why: q.Why, Kind: "quantity", Notices: q.Notices}, nil
	}
	w := &world{snap: snap, p: p}
	k, err := w.newReckoner()
	if err != nil {
		return nil, err
	}
	v := k.vector(c)
	leaves := map[string]Leaf{}
	for _, l := range c.Leaves() {
		leaves[l.Name] = l
	}
	var open func(name string) (*Unfolding, error)
	made := map[string]*Unfolding{}
	open = func(name string) (*Unfolding, error) {
		if u, done := made[name]; done {
			return u, nil
		}
		slot, _ := p.Graph.Slot(name)
		u := &Unfolding{Name: name, State: v[slot].State.String(), Value: v[slot].X, Why: v[slot].Why}
		if u.Value == math.MaxFloat64 {
			u.State, u.Value, u.Why = scoring.None.String(), 0, "no limit"
		}
		made[name] = u
		if q, ok := c.Consequence(name); ok && q.State == scoring.Number && q.Range == scoring.P10P90 {
			u.Low, u.High, u.Range, u.Notices = q.Low, q.High, string(q.Range), q.Notices
		}
		if quantity, ok := p.Graph.Quantity(name); ok {
			u.Title, u.Unit, u.Kind, u.Formula, u.Source = quantity.Title, quantity.Unit, "quantity", quantity.Formula, quantity.Source
			for _, in := range quantity.Inputs {
				i, err := open(in)
				if err != nil {
					return nil, err
				}
				u.Inputs = append(u.Inputs, i)
			}
			return u, nil
		}
		leaf, _ := p.Graph.Leaf(name)
		u.Title, u.Unit, u.Kind = leaf.Title, leaf.Unit, string(leaf.Kind)
		switch leaf.Kind {
		case scoring.FactorLeaf:
			f, changed, err := UserFactor(p, snap, name)
			if err != nil {
				return nil, err
			}
			u.Source, u.Provenance = f.Source, string(f.Provenance)
			if changed {
				u.Provenance = "user"
			}
			if f.Low != f.High {
				u.Low, u.High, u.Range = f.Low, f.High, f.RangeMeans()
			}
		case scoring.FactLeaf:
			u.Source = leaves[name].Source
		case scoring.SettingLeaf:
			for _, s := range settingLeaves {
				if s.leaf != name {
					continue
				}
				if set, byUser, in := snap.Lookup(s.setting); in {
					u.Source = set.Source
					u.Provenance = string(set.Provenance)
					if byUser {
						u.Provenance = strings.TrimSpace("user " + set.AcceptedBy)
					}
				}
			}
			if name == "demand_mwh_per_yr" && c.columns != nil && c.columns.demand.source != "" {
				u.Source = c.columns.demand.source
			}
		}
		return u, nil
	}
	return open(key)
}

// SortBy puts candidates with the best value of a key first. States stand behind numbers: none first
// when less is better, then unknown and the others, then never.
func SortBy(list []*Candidate, cat *study.Catalog, key string) {
	crit, _ := cat.Criterion(strings.TrimSuffix(key, criteria.BurdenSuffix))
	if c, ok := cat.Criterion(key); ok {
		crit = c
	}
	rank := func(c *Candidate) (int, float64) {
		q, ok := c.Consequence(key)
		if !ok {
			return 4, 0
		}
		switch q.State {
		case scoring.Number:
			if crit.Better == criteria.Less {
				return 1, q.Central
			}
			return 1, -q.Central
		case scoring.None:
			return 0, 0
		case scoring.Never:
			return 3, 0
		}
		return 2, 0
	}
	sort.SliceStable(list, func(i, j int) bool {
		a, x := rank(list[i])
		b, y := rank(list[j])
		if a != b {
			return a < b
		}
		if x != y {
			return x < y
		}
		return list[i].ID() < list[j].ID()
	})
}

// Check lists every notice on the data and settings of a state of a study: those of the imports, roles that are
// missing, legal values that are not set, layers that another program changed.
func Check(ctx context.Context, store study.Store, snap *study.Snapshot, p *Params) ([]geo.Notice, error) {
	out := []geo.Notice{}
	have := map[string]bool{}
	parcels := map[string]bool{}
	for _, l := range snap.Layers {
		have[l.Role] = true
		out = append(out, l.Notices...)
		v, changed, err := store.Version(ctx, l.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", l.Name, err)
		}
		if l.Role == "parcels" && v.Layer != nil {
			for _, f := range v.Layer.Features {
				parcels[f.ID] = true
			}
		}
		if changed {
			out = append(out, geo.Notice{Code: "changed_outside", Severity: geo.Fault, Layer: l.Name})
		}
	}
	voids, err := voidNotices(ctx, store, snap)
	if err != nil {
		return nil, err
	}
	out = append(out, voids...)
	sun, err := sunNotices(ctx, store, snap)
	if err != nil {
		return nil, err
	}
	hours, err := weatherNotices(ctx, store, snap)
	if err != nil {
		return nil, err
	}
	out = append(append(out, sun...), hours...)
	out = append(out, snap.TurbineNotices()...)
	out = append(out, layoutNotices(snap, parcels)...)
	idle, err := SettingNotices(ctx, StoreLoader(store), snap)
	if err != nil {
		return nil, err
	}
	out = append(out, idle...)
	out = append(out, missingMembers(snap, parcels)...)
	titles := p.Titled()
	for _, r := range snap.Catalog().Roles {
		if !have[r.Name] && r.WithoutIt != "" {
			out = append(out, geo.Notice{Code: "role_missing", Severity: geo.Info, Layer: r.Title, Args: map[string]string{"without": titles(r.WithoutIt), "holder": r.Holder}})
		}
	}
	for _, d := range snap.Catalog().Definitions {
		if d.Legal && !strings.Contains(d.Key, "<") {
			if v, _, in := snap.Lookup(d.Key); in && v.Value == study.NotSetText {
				out = append(out, geo.Notice{Code: "legal_not_set", Severity: geo.Warning, Field: d.Key, Args: map[string]string{"what": d.What}})
			}
		}
	}
	if !have["parcels"] {
		out = append(out, geo.Notice{Code: "no_parcels", Severity: geo.Fault})
	}
	if len(snap.Plants()) == 0 {
		out = append(out, geo.Notice{Code: "no_plants", Severity: geo.Fault})
	}
	return append(out, VoiceNotices(snap, p)...), nil
}

// voidNotices tells of grids with voids inside the district. A layer that another program changed is told of
// elsewhere, and not looked into.
func voidNotices(ctx context.Context, store study.Store, snap *study.Snapshot) ([]geo.Notice, error) {
	list, err := Voids(ctx, snap, StoreLoader(store))
	if errors.Is(err, study.ErrDamaged) {
		return nil, nil
	}
	var out []geo.Notice
	for _, v := range list {
		of := "the district"
		if v.Parcels {
			of = "the parcels"
		}
		at := v.At
		switch {
		case v.Apart:
			out = append(out, geo.Notice{Code: "grid_apart", Severity: geo.Warning, Layer: v.Layer, Args: map[string]string{"of": of}})
		case v.Voids > 0:
			out = append(out, geo.Notice{Code: "grid_voids", Severity: geo.Warning, Layer: v.Layer, At: &at, Args: map[string]string{
				"voids": strconv.Itoa(v.Voids), "count": strconv.Itoa(v.Cells), "of": of, "area_ha": strconv.FormatFloat(v.VoidHa, 'f', 2, 64)}})
		}
	}
	return out, err
}

// VoiceNotices lists the notices on the voices of a state of a study, the last ones that Check gives.
func VoiceNotices(snap *study.Snapshot, p *Params) []geo.Notice {
	var out []geo.Notice
	for _, v := range snap.Voices() {
		_, ns, err := scales(snap, p, v)
		if err != nil {
			out = append(out, geo.Notice{Code: "voice_unusable", Severity: geo.Fault, Field: "voice." + v, Args: map[string]string{"error": err.Error()}})
			continue
		}
		out = append(out, ns...)
	}
	return out
}

// StoreLoader reads layer contents from a store, each once.
func StoreLoader(store study.Store) Loader {
	seen := map[string]study.Version{}
	return func(ctx context.Context, digest string) (study.Version, error) {
		if v, ok := seen[digest]; ok {
			return v, nil
		}
		v, changed, err := store.Version(ctx, digest)
		if err != nil {
			return v, err
		}
		if changed {
			return v, fmt.Errorf("content %s was changed by another program; remove the layer and add it again: %w", digest[:12], study.ErrDamaged)
		}
		seen[digest] = v
		return v, nil
	}
}
