package study

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"slices"
	"strings"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/scoring/units"
)

// LayoutRecord is the kind of the records of turbines placed by hand.
const LayoutRecord RecordKind = "layout"

// HandLayout is where the user wants the turbines of one plant option to stand on one site.
type HandLayout struct {
	Site   string       `json:"site"`
	Plant  string       `json:"plant"`
	At     []geo.LonLat `json:"at"`
	Reason string       `json:"reason"`
}

// MostHandTurbines is how many turbines can be placed by hand on one site.
const MostHandTurbines = 200

// farthestHandKm is how far a turbine may stand from its site: farther is a slip, as latitude before longitude.
// What planning allows is not asked here; the computation shows the rules that a place breaks.
const farthestHandKm = 20

// LayoutError says why turbines cannot be placed by hand.
type LayoutError struct{ Site, Plant, What string }

func (e *LayoutError) Error() string {
	return fmt.Sprintf("site %s, plant %s: %s", e.Site, e.Plant, e.What)
}

// layoutKey names the record of a layout. No name of a plant option holds a dot, so a site may.
func layoutKey(site, plant string) string { return plant + "." + site }

// sites gives the parcels of every site with their shapes, and for each parcel in a group its site.
func (s *Study) sites(ctx context.Context) (snap *Snapshot, shapes map[string][]geo.LonLatGeometry, in map[string]string, err error) {
	snap, layers, err := s.parcels(ctx)
	if err != nil {
		return nil, nil, nil, err
	}
	in = map[string]string{}
	for _, g := range snap.Groups {
		for _, p := range g.Parcels {
			in[p] = g.Site
		}
	}
	shapes = map[string][]geo.LonLatGeometry{}
	for _, l := range layers {
		for _, f := range l.Features {
			site := first(in[f.ID], f.ID)
			shapes[site] = append(shapes[site], f.Geometry)
		}
	}
	return snap, shapes, in, nil
}

// placeable finds out whether turbines of the plant option can be placed on the site, and gives the site's shapes.
func (s *Study) placeable(ctx context.Context, site, plant string) (*Snapshot, []geo.LonLatGeometry, error) {
	snap, shapes, in, err := s.sites(ctx)
	if err != nil {
		return nil, nil, err
	}
	here, ok := shapes[site]
	switch {
	case ok:
	case len(shapes) == 0:
		return nil, nil, &NoSuchError{fmt.Sprintf("there is no site %q; the study has no parcels yet", site)}
	case in[site] != "":
		return nil, nil, &NoSuchError{fmt.Sprintf("the parcel %s is part of the site %s; place the turbines of that site", site, in[site])}
	default:
		names := make([]string, 0, len(shapes))
		for n := range shapes {
			names = append(names, n)
		}
		slices.Sort(names)
		near := ""
		if list := Near(site, names, 3); len(list) > 0 {
			near = "; near it are: " + strings.Join(list, ", ")
		}
		return nil, nil, &NoSuchError{fmt.Sprintf("there is no site %q among the %d%s", site, len(names), near)}
	}
	if err := snap.windOption(plant); err != nil {
		return nil, nil, err
	}
	return snap, here, nil
}

// windOption refuses a plant option that is not there or has no turbines.
func (n *Snapshot) windOption(plant string) error {
	has := func(id string) bool {
		t := n.Text("plant." + id + ".technology")
		return t == "wind" || t == "wind_solar"
	}
	if has(plant) {
		return nil
	}
	plants := n.Plants()
	with := "none has turbines"
	if list := slices.DeleteFunc(slices.Clone(plants), func(id string) bool { return !has(id) }); len(list) > 0 {
		with = "those with turbines are: " + strings.Join(list, ", ")
	}
	if slices.Contains(plants, plant) {
		return &NoSuchError{fmt.Sprintf("the plant option %q has no turbines (its technology is %s); %s", plant, first(n.Text("plant."+plant+".technology"), NotSetText), with)}
	}
	return &NoSuchError{fmt.Sprintf("there is no plant option %q; %s", plant, with)}
}

// tidy rounds the positions and refuses what cannot be a layout.
func (h HandLayout) tidy(site []geo.LonLatGeometry) (HandLayout, error) {
	bad := func(format string, args ...any) (HandLayout, error) {
		return h, &LayoutError{h.Site, h.Plant, fmt.Sprintf(format, args...)}
	}
	switch {
	case len(h.At) == 0:
		return bad("a layout by hand has at least one turbine; without it the program's own layout holds")
	case len(h.At) > MostHandTurbines:
		return bad("there are %d turbines, and at most %d can be placed by hand", len(h.At), MostHandTurbines)
	}
	at := make([]geo.LonLat, len(h.At))
	seen := map[geo.LonLat]int{}
	for i, p := range h.At {
		if math.IsNaN(p.Lon+p.Lat) || math.IsInf(p.Lon+p.Lat, 0) || math.Abs(p.Lon) > 180 || math.Abs(p.Lat) > 90 {
			return bad("turbine %d: %g,%g is no position in degrees; longitude comes first", i+1, p.Lon, p.Lat)
		}
		p = p.Rounded()
		if j, twice := seen[p]; twice {
			return bad("turbines %d and %d stand at the same place, %.7f,%.7f", j, i+1, p.Lon, p.Lat)
		}
		seen[p], at[i] = i+1, p
		if km := kmFrom(p, site); km > farthestHandKm {
			return bad("turbine %d, at %.7f,%.7f, lies %.0f km from the site; longitude comes before latitude", i+1, p.Lon, p.Lat, km)
		}
	}
	h.At = at
	return h, nil
}

// kmFrom gives roughly how far a position lies from the box around shapes; 0 inside, and where there is no shape.
func kmFrom(p geo.LonLat, shapes []geo.LonLatGeometry) float64 {
	lo, hi := geo.LonLat{Lon: math.Inf(1), Lat: math.Inf(1)}, geo.LonLat{Lon: math.Inf(-1), Lat: math.Inf(-1)}
	for _, g := range shapes {
		g.Each(func(q geo.LonLat) {
			lo = geo.LonLat{Lon: math.Min(lo.Lon, q.Lon), Lat: math.Min(lo.Lat, q.Lat)}
			hi = geo.LonLat{Lon: math.Max(hi.Lon, q.Lon), Lat: math.Max(hi.Lat, q.Lat)}
		})
	}
	if lo.Lon > hi.Lon {
		return 0
	}
	near := geo.LonLat{Lon: math.Min(math.Max(p.Lon, lo.Lon), hi.Lon), Lat: math.Min(math.Max(p.Lat, lo.Lat), hi.Lat)}
	return measure.RoughDistanceM(p, near) / units.MPerKm
}

// PutLayout places the turbines of a plant option on a site by hand, in the place of a layout by hand that was
// there, as one journal entry. It needs a reason. Rules that a place breaks are not asked.
func (s *Study) PutLayout(ctx context.Context, h HandLayout) error {
	if h.Reason = strings.TrimSpace(h.Reason); h.Reason == "" {
		return ErrReasonNeeded
	}
	_, site, err := s.placeable(ctx, h.Site, h.Plant)
	if err != nil {
		return err
	}
	if h, err = h.tidy(site); err != nil {
		return err
	}
	_, err = s.Edit(ctx, "place turbines", h.Reason, []Change{{Kind: LayoutRecord, Key: layoutKey(h.Site, h.Plant), New: Canonical(h)}}, nil)
	return err
}

// DropLayout takes a layout by hand out, so that the program's own holds again, as one journal entry.
func (s *Study) DropLayout(ctx context.Context, site, plant, reason string) error {
	snap, err := s.Snapshot()
	if err != nil {
		return err
	}
	if _, ok := snap.Layout(site, plant); !ok {
		return &NoSuchError{fmt.Sprintf("site %s, plant %s: no turbines are placed by hand there", site, plant)}
	}
	_, err = s.Edit(ctx, "own layout", strings.TrimSpace(reason), []Change{{Kind: LayoutRecord, Key: layoutKey(site, plant)}}, nil)
	return err
}

// Layouts gives the layouts by hand, by site, then plant option.
func (n *Snapshot) Layouts() []HandLayout { return slices.Clone(n.layouts) }

// Layout gives the layout by hand of a plant option on a site; ok is false where the program places the turbines.
func (n *Snapshot) Layout(site, plant string) (h HandLayout, ok bool) {
	for _, h := range n.layouts {
		if h.Site == site && h.Plant == plant {
			return h, true
		}
	}
	return HandLayout{}, false
}

// ChangeTitle says what a change did to a turbine of the user's own or to a layout by hand; empty for any other.
func ChangeTitle(c Change) string {
	switch c.Kind {
	case TurbineRecord:
		switch {
		case c.New == nil:
			return fmt.Sprintf("power curve of the turbine %s taken out", c.Key)
		case c.Old == nil:
			return fmt.Sprintf("power curve of the turbine %s added", c.Key)
		}
		return fmt.Sprintf("power curve of the turbine %s replaced", c.Key)
	case LayoutRecord:
		var h HandLayout
		raw, how := c.New, "by hand"
		if raw == nil {
			raw, how = c.Old, "by the program again"
		}
		if err := json.Unmarshal(raw, &h); err != nil {
			h.Plant, h.Site, _ = strings.Cut(c.Key, ".")
		}
		return fmt.Sprintf("turbines of %s, plant %s, placed %s", h.Site, h.Plant, how)
	}
	return ""
}
