package run

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"math"
	"sort"
	"strings"
	"sync"
	"sync/atomic"

	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/formats/gridfile"
	"groundtally/geo/index"
	"groundtally/geo/measure"
	"groundtally/geo/overlay"
	"groundtally/geo/raster"
	"groundtally/geo/terrain"
	"groundtally/scoring/units"
)

// layer is a layer of the study in the local frame, with an index over its features.
type layer struct {
	rec  study.LayerRecord
	src  *geo.Layer
	xy   []geo.XYGeometry
	hash [][sha256.Size]byte // per feature: geometry and matched values
	tree *index.Tree

	validity []atomic.Uint32 // per feature: 0 not asked yet

	variant  string            // "centroid" or "plot" for a layer with geometry other than drawn
	variants map[string]*layer // of this layer, made when first asked for
}

const (
	validFeature   = 1
	invalidFeature = 2
)

// clip cuts a feature to an extent. Whether the feature is valid is asked once, not for every site.
func (l *layer) clip(e *overlay.Engine, i int, x geo.Extent) (geo.XYGeometry, error) {
	if l.validity[i].Load() == 0 {
		ok, _, err := e.Valid(l.xy[i])
		if err != nil {
			return geo.XYGeometry{}, err
		}
		state := uint32(invalidFeature)
		if ok {
			state = validFeature
		}
		l.validity[i].Store(state)
	}
	if l.validity[i].Load() == validFeature {
		return e.ClipValid(l.xy[i], x)
	}
	return e.Clip(l.xy[i], x)
}

// variant gives a layer whose features stand at their centroids, or are the parcels on which they stand. A
// feature on no parcel stays as it is.
func (w *world) variant(l *layer, from string) *layer {
	if v := l.variants[from]; v != nil {
		return v
	}
	v := &layer{rec: l.rec, src: l.src, xy: make([]geo.XYGeometry, len(l.xy)), hash: make([][sha256.Size]byte, len(l.xy)), validity: make([]atomic.Uint32, len(l.xy)), variant: from}
	for i, g := range l.xy {
		v.xy[i] = g
		if at, ok := measure.Centroid(g); ok {
			switch from {
			case "centroid":
				v.xy[i] = geo.XYGeometry{Kind: geo.Points, Parts: [][][]geo.XY{{{at}}}}
			case "plot":
				if plot, ok := w.plotAt(at); ok {
					v.xy[i] = plot
				} else {
					w.plotless++
				}
			}
		}
		k := newKey("variant", 1)
		k.text(from)
		k.bytes(l.hash[i][:])
		k.geometry(v.xy[i])
		v.hash[i] = k.d.Raw()
	}
	v.tree = index.Of(v.xy, 0)
	if l.variants == nil {
		l.variants = map[string]*layer{}
	}
	l.variants[from] = v
	return v
}

// plotAt gives the parcel that holds a place.
func (w *world) plotAt(at geo.XY) (geo.XYGeometry, bool) {
	for _, l := range w.byRole["parcels"] {
		for _, i := range l.tree.Search(geo.EmptyExtent().Add(at), nil) {
			if measure.Inside(at, l.xy[i]) {
				return l.xy[i], true
			}
		}
	}
	return geo.XYGeometry{}, false
}

// text gives a field of a feature by the role's field name; empty when missing, and when the column is
// personal: such a text may not reach any result.
func (l *layer) text(i int, field string) string {
	c := l.src.ColumnIndex(l.rec.Match[field])
	if l.rec.Match[field] == "" || c < 0 || l.src.Columns[c].Personal {
		return ""
	}
	return strings.TrimSpace(l.src.Features[i].Values[c].String())
}

// number gives a numeric field in the unit of the role.
func (l *layer) number(i int, field, unit string) (float64, bool) {
	col := l.rec.Match[field]
	c := l.src.ColumnIndex(col)
	if col == "" || c < 0 {
		return 0, false
	}
	x, ok := l.src.Features[i].Values[c].Float()
	if !ok {
		return 0, false
	}
	if u := l.rec.Units[col]; u != "" {
		y, err := units.Convert(x, u, unit)
		if err != nil {
			return 0, false
		}
		x = y
	}
	return x, true
}

// site is one or more parcels considered together.
type site struct {
	id      string
	parcels []string
	geom    geo.XYGeometry
	box     geo.Extent
	rows    []parcelRow
	index   int // among the sites of its world
}

type parcelRow struct{ layer, feature int }

// world is a snapshot made ready for computing: everything in the local frame, indexed.
type world struct {
	snap    *study.Snapshot
	p       *Params
	frame   crs.Frame
	layers  []*layer // those with geometry, in the snapshot's order
	tables  map[string]*geo.Layer
	byRole  map[string][]*layer
	sites   []site
	options []option
	terrain *heights
	kept    *atomic.Pointer[keptTerrain] // heights of an earlier computation, then of this
	grids   []*resourceGrid              // of wind and sun, in the order of their names
	notices []geo.Notice

	load     Loader
	gridKeys []string // of the samples of grids that this state needs

	plotless int // features that should stand for their plots and are on none
}

// heights is the terrain in the local frame, read when it is first needed.
type heights struct {
	rec   study.LayerRecord
	reach geo.Extent // where heights are wanted besides the sites
	once  sync.Once
	load  func() (*terrain.Grid, error)
	grid  *terrain.Grid
	err   error
}

// keptTerrain are heights in the local frame, with all that they follow from, for the next computation.
type keptTerrain struct {
	digest, crs string
	centre      geo.LonLat
	box         geo.Extent
	grid        *terrain.Grid
}

// mostKeptCells bounds the heights that stay in memory between computations, to 16 MB.
const mostKeptCells = 4 << 20

func (k *keptTerrain) same(o *keptTerrain) bool {
	return k.digest == o.digest && k.crs == o.crs && k.centre == o.centre && k.box == o.box
}

func (h *heights) get() (*terrain.Grid, error) {
	h.once.Do(func() { h.grid, h.err = h.load() })
	return h.grid, h.err
}

// ErrNoParcels says that there is nothing to compare yet.
var ErrNoParcels = errors.New("the study has no parcels yet; add them as a layer of that role")

// ErrNoPlants says that there is no plant option yet.
var ErrNoPlants = errors.New("the study has no plant option yet; make one, as plant.wind with the technology wind")

// Loader reads the content of a layer version.
type Loader func(ctx context.Context, digest string) (study.Version, error)

func newWorld(ctx context.Context, snap *study.Snapshot, p *Params, load Loader) (*world, error) {
	w := &world{snap: snap, p: p, load: load, kept: &atomic.Pointer[keptTerrain]{}, byRole: map[string][]*layer{}, tables: map[string]*geo.Layer{}}
	if len(snap.LayersOf("parcels")) == 0 || snap.Frame == nil {
		return nil, ErrNoParcels
	}
	var err error
	if w.frame, err = crs.NewFrame(*snap.Frame); err != nil {
		return nil, err
	}
	for _, rec := range snap.Layers {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if rec.Kind == "raster" {
			if rec.Role == "terrain" && w.terrain == nil {
				w.terrain = &heights{rec: rec, reach: geo.EmptyExtent(), load: func() (*terrain.Grid, error) {
					g, err := w.readTerrain(ctx, rec, load)
					if err != nil {
						return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
					}
					return g, nil
				}}
			}
			if rec.Role == "wind_resource" || rec.Role == "solar_resource" {
				w.grids = append(w.grids, &resourceGrid{rec: rec})
			}
			continue
		}
		v, err := load(ctx, rec.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		switch {
		case rec.Kind == "table":
			if _, there := w.tables[rec.Role]; !there { // the first by name counts
				w.tables[rec.Role] = v.Layer
			}
		default:
			l := &layer{rec: rec, src: v.Layer, xy: make([]geo.XYGeometry, len(v.Layer.Features)), hash: make([][sha256.Size]byte, len(v.Layer.Features)), validity: make([]atomic.Uint32, len(v.Layer.Features))}
			for i, f := range v.Layer.Features {
				if l.xy[i], err = w.frame.Project(f.Geometry); err != nil {
					return nil, fmt.Errorf("layer %q, feature %s: %w", rec.Name, f.ID, err)
				}
				k := newKey("feature", 1)
				k.text(f.ID)
				k.geometry(l.xy[i])
				for _, val := range f.Values {
					k.int(int(val.Kind))
					k.text(val.String())
				}
				l.hash[i] = k.d.Raw()
			}
			l.tree = index.Of(l.xy, 0)
			w.layers = append(w.layers, l)
			w.byRole[rec.Role] = append(w.byRole[rec.Role], l)
		}
	}
	w.makeSites()
	if err := w.makeOptions(); err != nil {
		return nil, err
	}
	if w.terrain == nil {
		w.notices = append(w.notices, geo.Notice{Code: "terrain_missing", Severity: geo.Info})
	}
	return w, nil
}

// terrainMarginM is how far around the parcels heights are kept.
const terrainMarginM = 200

// readGrid reads a raster with the way to its reference system.
func readGrid(ctx context.Context, rec study.LayerRecord, load Loader) (*raster.Grid, *crs.Transform, error) {
	v, err := load(ctx, rec.Digest)
	if err != nil {
		return nil, nil, err
	}
	g, _, _, err := gridfile.Decode(ctx, v.Media, rec.File, v.Blob)
	if err != nil {
		return nil, nil, err
	}
	t, err := crs.NewTransform(rec.CRS)
	return g, t, err
}

// readTerrain brings the heights around the parcels into the local frame, at the cells of the file.
func (w *world) readTerrain(ctx context.Context, rec study.LayerRecord, load Loader) (*terrain.Grid, error) {
	box := geo.EmptyExtent()
	for _, s := range w.sites {
		box = box.Union(s.box)
	}
	box = box.Union(w.terrain.reach).Grow(terrainMarginM)
	now := &keptTerrain{digest: rec.Digest, crs: rec.CRS, centre: w.frame.Centre(), box: box}
	if old := w.kept.Load(); old != nil && old.same(now) {
		return old.grid, nil
	}
	raw, t, err := readGrid(ctx, rec, load)
	if err != nil {
		return nil, err
	}
	own, place, err := w.ownGrid(raw)
	if err != nil {
		return nil, err
	}
	cell := math.Min(raw.CellX, raw.CellY)
	if geographic(t, w.frame) {
		cell *= metresPerDegree
	}
	// Outside the file there is nothing to ask for.
	if has, ok := w.reachOf(raw, t); ok && has.Meets(box) {
		has = has.Grow(2 * cell)
		box = geo.Extent{MinX: max(box.MinX, has.MinX), MinY: max(box.MinY, has.MinY), MaxX: min(box.MaxX, has.MaxX), MaxY: min(box.MaxY, has.MaxY)}
	}
	// Cells stand at multiples of their size from the frame's centre, so that a site's heights do not
	// depend on which other sites there are.
	origin := geo.XY{X: math.Floor(box.MinX/cell) * cell, Y: math.Floor(box.MinY/cell) * cell}
	nx, ny := int((box.MaxX-origin.X)/cell)+2, int((box.MaxY-origin.Y)/cell)+2
	var bad error
	g, err := terrain.Fill(origin, cell, nx, ny, func(p geo.XY) (float64, bool) {
		if bad == nil {
			bad = ctx.Err() // a large grid takes long, and nobody waits after an abort
		}
		if bad != nil {
			return 0, false
		}
		ll, err := w.frame.Inverse(p)
		if err != nil {
			bad = err
			return 0, false
		}
		x, y, err := t.Inverse(ll)
		if err != nil {
			bad = err
			return 0, false
		}
		return own.Sample(place(geo.XY{X: x, Y: y}))
	})
	if err == nil {
		err = bad
	}
	if err == nil && w.terrain.reach.Empty() && nx*ny <= mostKeptCells {
		now.grid = g
		w.kept.Store(now)
	}
	return g, err
}

// reachOf gives the extent of a grid in the local frame from points on its border, with a margin for what its
// sides bend between them; ok is false where one of them has no place there.
func (w *world) reachOf(raw *raster.Grid, t *crs.Transform) (x geo.Extent, ok bool) {
	const points = 32
	x = geo.EmptyExtent()
	width, height := float64(raw.NCols)*raw.CellX, float64(raw.NRows)*raw.CellY
	for i := range points + 1 {
		a := float64(i) / points
		for _, at := range [4]geo.XY{{X: a}, {X: a, Y: 1}, {Y: a}, {X: 1, Y: a}} {
			ll, err := t.Forward(raw.XLL+at.X*width, raw.YLL+at.Y*height)
			if err != nil {
				return x, false
			}
			p, err := w.frame.Forward(ll)
			if err != nil {
				return x, false
			}
			x = x.Union(geo.Extent{MinX: p.X, MinY: p.Y, MaxX: p.X, MaxY: p.Y})
		}
	}
	return x.Grow(0.02 * max(x.MaxX-x.MinX, x.MaxY-x.MinY)), true
}

// geographic reports whether a system gives the frame's centre as degrees.
func geographic(t *crs.Transform, f crs.Frame) bool {
	c := f.Centre()
	x, y, err := t.Inverse(c)
	return err == nil && math.Abs(x-c.Lon) < 1 && math.Abs(y-c.Lat) < 1
}

// metresPerDegree sizes the cells of a grid in degrees; only their fineness depends on it.
const metresPerDegree = 111_200

// ownGrid turns a grid of a file, north row first, into one in the file's own coordinates, with the way to
// them. A grid of oblong cells becomes one of cells of size one, counted from its corner.
func (w *world) ownGrid(raw *raster.Grid) (g *terrain.Grid, place func(geo.XY) geo.XY, err error) {
	h := make([]float32, len(raw.Values))
	for r := range raw.NRows {
		copy(h[r*raw.NCols:(r+1)*raw.NCols], raw.Values[(raw.NRows-1-r)*raw.NCols:(raw.NRows-r)*raw.NCols])
	}
	if raw.CellX != raw.CellY {
		g, err = terrain.New(geo.XY{X: 0.5, Y: 0.5}, 1, raw.NCols, raw.NRows, h, float32(raw.NoData))
		return g, func(p geo.XY) geo.XY { return geo.XY{X: (p.X - raw.XLL) / raw.CellX, Y: (p.Y - raw.YLL) / raw.CellY} }, err
	}
	g, err = terrain.New(geo.XY{X: raw.XLL + raw.CellX/2, Y: raw.YLL + raw.CellY/2}, raw.CellX, raw.NCols, raw.NRows, h, float32(raw.NoData))
	return g, func(p geo.XY) geo.XY { return p }, err
}

// heightM gives the ground height at a place; ok is false outside the terrain or without one.
func (w *world) heightM(p geo.XY) (m float64, ok bool, err error) {
	if w.terrain == nil {
		return 0, false, nil
	}
	g, err := w.terrain.get()
	if err != nil {
		return 0, false, err
	}
	m, ok = g.Sample(p)
	return m, ok, nil
}

// makeSites puts parcels together by the study's groups; every other parcel is a site of its own. A
// single parcel whose identifier is taken, by a group or by another layer's parcel, is called by its layer
// too, and that is said.
func (w *world) makeSites() {
	group := map[string]string{}
	names := map[string]bool{}
	for _, g := range w.snap.Groups {
		names[g.Site] = true
		for _, p := range g.Parcels {
			group[p] = g.Site
		}
	}
	grouped := map[string]int{}
	seen := map[string]bool{}
	for li, l := range w.byRole["parcels"] {
		for fi, f := range l.src.Features {
			i := len(w.sites)
			if g, in := group[f.ID]; in {
				seen[f.ID] = true
				if at, there := grouped[g]; there {
					i = at
				} else {
					grouped[g] = i
					w.sites = append(w.sites, site{id: g, geom: geo.XYGeometry{Kind: geo.Polygons}})
				}
			} else {
				id := f.ID
				if names[id] {
					id = l.rec.Name + "/" + f.ID
					w.notices = append(w.notices, geo.Notice{Code: "same_parcel_twice", Severity: geo.Warning, Layer: l.rec.Name, Feature: f.ID, Args: map[string]string{"now": id}})
				}
				names[id] = true
				w.sites = append(w.sites, site{id: id, geom: geo.XYGeometry{Kind: geo.Polygons}})
			}
			s := &w.sites[i]
			s.parcels = append(s.parcels, f.ID)
			s.rows = append(s.rows, parcelRow{li, fi})
			s.geom.Parts = append(s.geom.Parts, l.xy[fi].Parts...)
		}
	}
	w.notices = append(w.notices, missingMembers(w.snap, seen)...)
	sort.Slice(w.sites, func(i, j int) bool { return w.sites[i].id < w.sites[j].id })
	for i := range w.sites {
		w.sites[i].box, w.sites[i].index = geo.ExtentOf(w.sites[i].geom), i
	}
}

// missingMembers tells of parcels that a group names and no layer holds.
func missingMembers(snap *study.Snapshot, there map[string]bool) []geo.Notice {
	var out []geo.Notice
	for _, g := range snap.Groups {
		for _, p := range g.Parcels {
			if !there[p] {
				out = append(out, geo.Notice{Code: "group_parcel_missing", Severity: geo.Warning, Feature: p, Args: map[string]string{"site": g.Site}})
			}
		}
	}
	return out
}

// gates gives the gates of a site: the owners' consent, the least of its parcels'.
func (w *world) gates(s site) map[string]Gate {
	order := []string{"no", "unknown", "not asked", "asked", "conditional", "yes"}
	worst := len(order) - 1
	for _, r := range s.rows {
		state := w.byRole["parcels"][r.layer].text(r.feature, "owner_consent")
		at := 1
		for i, o := range order {
			if strings.EqualFold(o, state) {
				at = i
			}
		}
		worst = min(worst, at)
	}
	return map[string]Gate{"owner_consent": {State: order[worst]}}
}

// option is a plant option with its parts: wind, solar, or both.
type option struct {
	id, technology, fit string
	wind, solar         bool
	settings            map[string]string // effective plant.<id>.* values
}

// part names of an option.
const (
	windPart  = "wind"
	solarPart = "solar"
)

func (o option) parts() []string {
	var out []string
	if o.wind {
		out = append(out, windPart)
	}
	if o.solar {
		out = append(out, solarPart)
	}
	return out
}

func (o option) num(name string) (float64, bool) {
	return study.Setting{Value: o.settings[name]}.Number()
}

func (w *world) makeOptions() error {
	ids := w.snap.Plants()
	if len(ids) == 0 {
		return ErrNoPlants
	}
	for _, id := range ids {
		o := option{id: id, settings: map[string]string{}}
		for _, d := range w.snap.Catalog().Definitions {
			name, ok := strings.CutPrefix(d.Key, "plant.<plant>.")
			if !ok {
				continue
			}
			if s, _, in := w.snap.Lookup("plant." + id + "." + name); in {
				o.settings[name] = s.Value
			}
		}
		o.technology, o.fit = o.settings["technology"], o.settings["fit"]
		if o.technology == "" || o.technology == study.NotSetText {
			return fmt.Errorf("plant option %q has no technology; set plant.%s.technology", id, id)
		}
		o.wind = o.technology == "wind" || o.technology == "wind_solar"
		o.solar = o.technology != "wind"
		w.options = append(w.options, o)
	}
	return nil
}

// names gives the names under which a part of an option finds its settings, the most special first. The
// panels of a plant of both are named <option>_panels: a distance named after the option is the masts'.
func (o option) names(part string) []string {
	if o.wind && o.solar && part == solarPart {
		return []string{o.id + "_panels", "solar_fixed", solarPart}
	}
	return []string{o.id, o.technology, part}
}

// cascade finds a setting by the most special name there is. A user's setting of a general name stands
// before a default of a special one.
func (w *world) cascade(prefix string, o option, part, suffix string) (key string, s study.Setting, ok bool) {
	names := o.names(part)
	for _, n := range names {
		if s, byUser, in := w.snap.Lookup(prefix + n + suffix); in && byUser {
			return prefix + n + suffix, s, true
		}
	}
	for _, n := range names {
		if s, _, in := w.snap.Lookup(prefix + n + suffix); in {
			return prefix + n + suffix, s, true
		}
	}
	return "", study.Setting{}, false
}

func (w *world) cascadeNumber(prefix string, o option, part, suffix string) (x float64, key string, ok bool) {
	key, s, ok := w.cascade(prefix, o, part, suffix)
	if !ok {
		return 0, key, false
	}
	x, ok = s.Number()
	return x, key, ok
}

// enginePool keeps the engines of workers from one batch to the next.
type enginePool struct {
	mu   sync.Mutex
	free []*overlay.Engine
}

func (p *enginePool) open() (*overlay.Engine, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if n := len(p.free); n > 0 {
		e := p.free[n-1]
		p.free = p.free[:n-1]
		return e, nil
	}
	return openEngine()
}

func (p *enginePool) close(e *overlay.Engine) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.free = append(p.free, e)
}

func (p *enginePool) empty() {
	for _, e := range p.free {
		closeEngine(e)
	}
	p.free = nil
}

// engines gives each worker a geometry engine of its own.
func openEngine() (*overlay.Engine, error) { return overlay.New(), nil }

func closeEngine(e *overlay.Engine) { _ = e.Close() } // only frees memory
