package run

import (
	"context"
	"errors"
	"sort"

	"groundtally/geo"
	"groundtally/geo/measure"
	"groundtally/geo/terrain"
	"groundtally/scoring/units"
)

// Relief is the terrain of a site, or of one buildable patch of it.
type Relief struct {
	Site  string  `json:"site"`
	Patch int     `json:"patch,omitempty"` // from 1, the largest first; 0 for the whole site
	Ha    float64 `json:"area_ha"`

	HeightShare float64  `json:"height_share"` // of the area with known heights
	MeanM       *float64 `json:"mean_height_m"`
	LeastM      *float64 `json:"least_height_m"`
	MostM       *float64 `json:"greatest_height_m"`
	SlopeDeg    *float64 `json:"mean_slope_deg"`
	SteepestDeg *float64 `json:"greatest_slope_deg"` // of its cells
	AspectDeg   *float64 `json:"mean_aspect_deg"`    // from true north; nil for level ground, or ground that falls all ways
	AspectShare float64  `json:"aspect_agreement"`   // 1 when all of it falls one way, 0 when the ways cancel out
	RoughnessM  *float64 `json:"roughness_index_m"`  // ruggedness index of the terrain's cells

	HorizonDeg   []*float64 `json:"horizon_deg,omitempty"` // every 5 degrees clockwise from true north, of the site's middle
	HorizonKnown float64    `json:"horizon_known"`         // least share of the reach with known heights
}

// The horizon of a site is looked for this far, in so many directions.
const (
	horizonReachM   = 20_000
	horizonAzimuths = 72
	eyeM            = 1.5 // common practice: eyes, or the middle of a panel, above the ground
)

// ErrNoTerrain says that the study has no heights.
var ErrNoTerrain = errors.New("the study has no layer of ground heights; add one as terrain")

// Relief gives the terrain of a site and, with a plant option, of each buildable patch for its first part.
func (s *Surveyor) Relief(ctx context.Context, siteID, plant string) ([]Relief, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	here, err := s.site(ctx, &Candidate{Site: siteID})
	if err != nil {
		return nil, err
	}
	if s.world.terrain == nil {
		return nil, ErrNoTerrain
	}
	if s.wide == nil {
		s.wide = s.world.withHorizon(ctx, s.load)
	}
	w := s.wide
	t, err := w.terrain.get()
	if err != nil {
		return nil, err
	}
	whole, err := w.relief(t, here.geom, here)
	if err != nil {
		return nil, err
	}
	whole.Site = siteID
	if err := w.horizon(t, here, &whole); err != nil {
		return nil, err
	}
	out := []Relief{whole}
	for _, o := range w.options {
		if o.id != plant {
			continue
		}
		rs, err := w.rulesFor(o, o.parts()[0])
		if err != nil {
			return nil, err
		}
		g, err := s.ground(ctx, rs, here)
		if err != nil {
			return nil, err
		}
		for i, part := range largestFirst(g.Area) {
			one, err := w.relief(t, geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}}, here)
			if err != nil {
				return nil, err
			}
			one.Site, one.Patch = siteID, i+1
			out = append(out, one)
		}
	}
	return out, nil
}

// withHorizon gives the world with heights of its own that reach as far as horizons are looked for.
func (w *world) withHorizon(ctx context.Context, load Loader) *world {
	out := *w
	rec := w.terrain.rec
	box := geo.EmptyExtent()
	for _, s := range w.sites {
		box = box.Union(s.box)
	}
	out.terrain = &heights{rec: rec, reach: box.Grow(horizonReachM), load: func() (*terrain.Grid, error) { return out.readTerrain(ctx, rec, load) }}
	return &out
}

func (w *world) relief(t *terrain.Grid, g geo.XYGeometry, here site) (Relief, error) {
	r := Relief{Ha: measure.AreaM2(g) / units.M2PerHa}
	sum, err := t.Over(g, 90)
	if err != nil {
		return r, siteError(here, err)
	}
	r.HeightShare = sum.HeightShare
	if sum.HasHeight {
		r.MeanM, r.LeastM, r.MostM = &sum.MeanM, &sum.MinM, &sum.MaxM
	}
	if sum.HasSlope {
		r.SlopeDeg, r.SteepestDeg, r.RoughnessM = &sum.MeanSlopeDeg, &sum.MaxSlopeDeg, &sum.RoughnessM
	}
	if r.AspectShare = sum.AspectLength; sum.HasAspect {
		a, err := w.frame.TrueAzimuthDeg(here.box.Centre(), sum.MeanAspectDeg)
		if err != nil {
			return r, err
		}
		r.AspectDeg = &a
	}
	return r, nil
}

// horizon gives the horizon of a site's middle from true north, between the directions that the grid gives.
func (w *world) horizon(t *terrain.Grid, here site, r *Relief) error {
	at := middle(here)
	p := at.Parts[0][0][0]
	turn, err := w.frame.ConvergenceDeg(p)
	if err != nil {
		return err
	}
	if _, ok := t.Sample(p); !ok {
		return nil // unknown, and shown so
	}
	// Ten times finer than asked, so that turning to true north moves no angle by more than a quarter degree.
	const finer = 10
	angles, known, err := t.Horizon(p, eyeM, horizonAzimuths*finer, horizonReachM)
	if err != nil {
		return siteError(here, err)
	}
	step := 360.0 / float64(len(angles))
	r.HorizonKnown = 1
	for i := range horizonAzimuths {
		grid := float64(i)*360/horizonAzimuths - turn
		n := (int(grid/step+float64(len(angles))+0.5) + len(angles)) % len(angles)
		r.HorizonKnown = min(r.HorizonKnown, known[n])
		if angle := angles[n]; known[n] > 0 {
			r.HorizonDeg = append(r.HorizonDeg, &angle)
		} else {
			r.HorizonDeg = append(r.HorizonDeg, nil)
		}
	}
	return nil
}

// largestFirst gives the parts of polygons by their area.
func largestFirst(g geo.XYGeometry) [][][]geo.XY {
	parts := append([][][]geo.XY(nil), g.Parts...)
	area := func(i int) float64 {
		return measure.AreaM2(geo.XYGeometry{Kind: geo.Polygons, Parts: parts[i : i+1]})
	}
	sort.SliceStable(parts, func(i, j int) bool { return area(i) > area(j) })
	return parts
}
