package files

import (
	"cmp"
	"context"
	"runtime"
	"slices"
	"sync"
	"sync/atomic"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/index"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
)

// tools are the geometry services of an import.
type tools struct {
	engine *overlay.Engine
}

// NewTools gives the geometry services of an import, to be closed after use.
func NewTools() (study.Tools, func()) {
	t := &tools{engine: overlay.New()}
	return t, func() { _ = t.engine.Close() } // closing only frees memory
}

func (t *tools) ToLonLat(code string) (func(geo.LonLat) (geo.LonLat, error), string, error) {
	tr, err := crs.NewTransform(code)
	if err != nil {
		return nil, "", err
	}
	if tr.Identity() {
		return func(p geo.LonLat) (geo.LonLat, error) { return p, nil }, "none: longitude and latitude on WGS 84", nil
	}
	return func(p geo.LonLat) (geo.LonLat, error) { return tr.Forward(p.Lon, p.Lat) }, tr.Code() + " to OGC:CRS84", nil
}

func (t *tools) Operation(code string, at geo.LonLat) (study.Operation, error) {
	tr, err := crs.NewTransform(code)
	if err != nil {
		return study.Operation{}, err
	}
	if tr.Identity() {
		return study.Operation{Known: true}, nil
	}
	a, err := tr.AccuracyAt(at.Lon, at.Lat)
	if err != nil {
		return study.Operation{}, err
	}
	e := tr.Editions()
	return study.Operation{Name: a.Operation, AccuracyM: a.Metres, Known: a.Known, Ballpark: a.Ballpark, Database: "PROJ " + e.Library + ", EPSG " + e.Database}, nil
}

func (t *tools) Frame(centre geo.LonLat) (func(geo.LonLatGeometry) (geo.XYGeometry, error), func(geo.XYGeometry) (geo.LonLatGeometry, error), error) {
	f, err := crs.NewFrame(centre)
	if err != nil {
		return nil, nil, err
	}
	return f.Project, f.Unproject, nil
}

func (t *tools) Overlaps(polygons []geo.XYGeometry, leastM2 float64) ([]study.Overlap, error) {
	tree := index.Of(polygons, 0)
	var out []study.Overlap
	for i, g := range polygons {
		for _, j := range tree.Search(geo.ExtentOf(g).Grow(-edgeM), nil) {
			if j <= i {
				continue
			}
			both, err := t.engine.Intersection(g, polygons[j])
			if err != nil {
				return nil, err
			}
			if both.Kind != geo.Polygons {
				continue
			}
			if m2 := measure.AreaM2(both); m2 > leastM2 {
				out = append(out, study.Overlap{I: i, J: j, AreaM2: m2})
			}
		}
	}
	slices.SortFunc(out, func(a, b study.Overlap) int { return cmp.Or(cmp.Compare(a.I, b.I), cmp.Compare(a.J, b.J)) })
	return out, nil
}

// edgeM is how far neighbours' boxes may reach over each other without their outlines being compared.
const edgeM = 0.01

func (t *tools) Repair(ctx context.Context, gs []geo.XYGeometry) ([]study.Repaired, error) {
	out := make([]study.Repaired, len(gs))
	var next atomic.Int64
	var wg sync.WaitGroup
	const block = 256
	for n := range min(runtime.GOMAXPROCS(0), len(gs)/block+1) {
		wg.Go(func() {
			e := t.engine
			if n > 0 { // an engine serves one goroutine at a time
				e = overlay.New()
				defer func() { _ = e.Close() }() // closing only frees memory
			}
			for ctx.Err() == nil {
				from := int(next.Add(block)) - block
				if from >= len(gs) {
					return
				}
				for i := from; i < min(from+block, len(gs)); i++ {
					g, rep, err := e.Repair(gs[i])
					out[i] = study.Repaired{Geometry: g, Changed: rep.Changed, BeforeM2: rep.BeforeM2, AfterM2: rep.AfterM2, Err: err}
				}
			}
		})
	}
	wg.Wait()
	return out, ctx.Err()
}
