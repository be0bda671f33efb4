package run

import (
	"context"
	"fmt"
	"math"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/index"
	"groundtally/geo/measure"
	"groundtally/scoring/units"
)

// GridVoids counts the cells of one grid whose middles lie inside the district.
type GridVoids struct {
	Layer   string     // its name
	Cells   int        // inside the district
	Voids   int        // of these without a value
	VoidHa  float64    // their area
	At      geo.LonLat // the middle of the first void, from north to south and west to east
	Parcels bool       // there is no district, so the parcels stand for it
	Apart   bool       // no cell has its middle there
}

// voidRoles are the roles whose grids are looked at for voids.
var voidRoles = map[string]bool{"terrain": true, "surface_heights": true, "wind_resource": true, "solar_resource": true}

// Voids looks for cells without a value inside the district, or on the parcels where there is no district, in every
// grid of heights, wind or sun. It is empty for a study without either, and gives a row for each grid, in the order of
// their names, also for those without voids.
func Voids(ctx context.Context, snap *study.Snapshot, load Loader) ([]GridVoids, error) {
	if snap.Frame == nil {
		return nil, nil
	}
	f, err := crs.NewFrame(*snap.Frame)
	if err != nil {
		return nil, err
	}
	role := "district"
	if len(snap.LayersOf(role)) == 0 {
		role = "parcels"
	}
	var inside []geo.XYGeometry
	for _, rec := range snap.LayersOf(role) {
		v, err := load(ctx, rec.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		if v.Layer == nil {
			continue
		}
		for _, feature := range v.Layer.Features {
			g, err := f.Project(feature.Geometry)
			if err != nil {
				return nil, fmt.Errorf("layer %q, feature %s: %w", rec.Name, feature.ID, err)
			}
			if g.Kind == geo.Polygons && !g.Empty() {
				inside = append(inside, g)
			}
		}
	}
	if len(inside) == 0 {
		return nil, nil
	}
	tree := index.Of(inside, 0)
	var out []GridVoids
	for _, rec := range snap.Layers {
		if rec.Kind != "raster" || !voidRoles[rec.Role] {
			continue
		}
		row, err := voidsOf(ctx, rec, load, f, tree, inside)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		row.Parcels = role == "parcels"
		out = append(out, row)
	}
	return out, nil
}

func voidsOf(ctx context.Context, rec study.LayerRecord, load Loader, f crs.Frame, tree *index.Tree, inside []geo.XYGeometry) (GridVoids, error) {
	out := GridVoids{Layer: rec.Name}
	g, t, err := readGrid(ctx, rec, load)
	if err != nil {
		return out, err
	}
	place := func(col, row float64) (geo.LonLat, geo.XY, bool) {
		ll, err := t.Forward(g.XLL+col*g.CellX, g.YLL+(float64(g.NRows)-row)*g.CellY)
		if err != nil {
			return ll, geo.XY{}, false
		}
		xy, err := f.Forward(ll)
		return ll, xy, err == nil // what lies too far off for the frame is not in the district
	}
	// The box of the district in the grid's own system, so that a grid of a whole country is not walked through.
	own := geo.EmptyExtent()
	for _, poly := range inside {
		for _, part := range poly.Parts {
			for _, ring := range part {
				for _, p := range ring {
					if ll, err := f.Inverse(p); err == nil {
						if x, y, err := t.Inverse(ll); err == nil {
							own = own.Add(geo.XY{X: (x - g.XLL) / g.CellX, Y: float64(g.NRows) - (y-g.YLL)/g.CellY})
						}
					}
				}
			}
		}
	}
	// Straight lines between corners bow in another system; a cell and a hundredth of the box more hold them.
	own = own.Grow(1 + math.Max(own.MaxX-own.MinX, own.MaxY-own.MinY)/100)
	c0, r0 := max(0, int(math.Floor(own.MinX))), max(0, int(math.Floor(own.MinY)))
	c1, r1 := min(g.NCols-1, int(math.Floor(own.MaxX))), min(g.NRows-1, int(math.Floor(own.MaxY)))
	var buf []int
	for r := r0; r <= r1; r++ {
		if err := ctx.Err(); err != nil {
			return out, err
		}
		for c := c0; c <= c1; c++ {
			ll, p, ok := place(float64(c)+0.5, float64(r)+0.5)
			if !ok {
				continue
			}
			in := false
			buf = tree.Search(geo.EmptyExtent().Add(p), buf[:0])
			for _, i := range buf {
				in = in || measure.Inside(p, inside[i])
			}
			if !in {
				continue
			}
			out.Cells++
			if _, ok := g.At(c, r); ok {
				continue
			}
			if out.Voids == 0 {
				out.At = ll
			}
			out.Voids++
			ring := make([]geo.XY, 0, 5)
			for _, corner := range [5][2]float64{{0, 1}, {1, 1}, {1, 0}, {0, 0}, {0, 1}} {
				if _, q, ok := place(float64(c)+corner[0], float64(r)+corner[1]); ok {
					ring = append(ring, q)
				}
			}
			out.VoidHa += measure.AreaM2(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{{ring}}}) / units.M2PerHa
		}
	}
	out.Apart = out.Cells == 0
	return out, nil
}
