package study

import (
	"context"
	"errors"
	"fmt"
	"sort"

	"groundtally/geo"
)

// parcels reads the contents of all parcel layers.
func (s *Study) parcels(ctx context.Context) (*Snapshot, []*geo.Layer, error) {
	snap, err := s.Snapshot()
	if err != nil {
		return nil, nil, err
	}
	var out []*geo.Layer
	for _, l := range snap.LayersOf("parcels") {
		v, _, err := s.store.Version(ctx, l.Digest)
		if err != nil {
			return nil, nil, fmt.Errorf("read layer %q: %w", l.Name, err)
		}
		out = append(out, v.Layer)
	}
	return snap, out, nil
}

// GroupBy makes a site of all parcels that have the same value in a column. Parcels without a value
// stay alone.
func (s *Study) GroupBy(ctx context.Context, column, reason string) ([]Group, error) {
	_, layers, err := s.parcels(ctx)
	if err != nil {
		return nil, err
	}
	members := map[string][]string{}
	alone := map[string]bool{}
	found := false
	for _, l := range layers {
		at := l.ColumnIndex(column)
		if at < 0 {
			for _, f := range l.Features {
				alone[f.ID] = true
			}
			continue
		}
		if l.Columns[at].Personal {
			// Its values would become the names of sites, which every table shows.
			return nil, &ValueError{Key: column, Err: errors.New("the column is personal and cannot name sites")}
		}
		found = true
		for _, f := range l.Features {
			if v := f.Values[at].String(); v != "" {
				members[v] = append(members[v], f.ID)
			} else {
				alone[f.ID] = true
			}
		}
	}
	if !found {
		return nil, fmt.Errorf("the parcels have no column %q: %w", column, ErrNotThere)
	}
	var groups []Group
	for site, ids := range members {
		if alone[site] {
			return nil, fmt.Errorf("site %q: a parcel outside the group has this identifier: %w", site, ErrNameInUse)
		}
		if len(ids) < 2 {
			continue // one parcel is a site by itself
		}
		sort.Strings(ids)
		groups = append(groups, Group{Site: site, Parcels: ids})
	}
	sort.Slice(groups, func(i, j int) bool { return groups[i].Site < groups[j].Site })
	return groups, s.putGroups(ctx, reason, groups)
}

// GroupParcels makes one site of the parcels. A parcel leaves the group it was in.
func (s *Study) GroupParcels(ctx context.Context, site string, ids []string, reason string) ([]Group, error) {
	_, layers, err := s.parcels(ctx)
	if err != nil {
		return nil, err
	}
	known := map[string]bool{}
	for _, l := range layers {
		for _, f := range l.Features {
			known[f.ID] = true
		}
	}
	seen := map[string]bool{}
	var list []string
	for _, id := range ids {
		if !known[id] {
			return nil, fmt.Errorf("parcel %q: %w", id, ErrNotThere)
		}
		if !seen[id] {
			seen[id] = true
			list = append(list, id)
		}
	}
	if known[site] && !seen[site] {
		return nil, fmt.Errorf("site %q: a parcel outside the group has this identifier: %w", site, ErrNameInUse)
	}
	sort.Strings(list)
	groups := []Group{{Site: site, Parcels: list}}
	return groups, s.putGroups(ctx, reason, groups)
}

func (s *Study) putGroups(ctx context.Context, reason string, groups []Group) error {
	snap, err := s.Snapshot()
	if err != nil {
		return err
	}
	moved := map[string]bool{}
	replaced := map[string]bool{}
	for _, g := range groups {
		replaced[g.Site] = true
		for _, p := range g.Parcels {
			moved[p] = true
		}
	}
	var changes []Change
	for _, old := range snap.Groups {
		if replaced[old.Site] {
			continue
		}
		var rest []string
		for _, p := range old.Parcels {
			if !moved[p] {
				rest = append(rest, p)
			}
		}
		switch {
		case len(rest) == len(old.Parcels):
		case len(rest) < 2:
			changes = append(changes, Change{Kind: GroupRecord, Key: old.Site})
		default:
			changes = append(changes, Change{Kind: GroupRecord, Key: old.Site, New: Canonical(Group{Site: old.Site, Parcels: rest})})
		}
	}
	for _, g := range groups {
		changes = append(changes, Change{Kind: GroupRecord, Key: g.Site, New: Canonical(g)})
	}
	_, err = s.Edit(ctx, "group", reason, changes, nil)
	return err
}

// Ungroup makes the parcels of a site stand alone again.
func (s *Study) Ungroup(ctx context.Context, site, reason string) error {
	e, err := s.Edit(ctx, "group", reason, []Change{{Kind: GroupRecord, Key: site}}, nil)
	if err == nil && e.Seq == 0 {
		return fmt.Errorf("site %q is no group: %w", site, ErrNotThere)
	}
	return err
}
