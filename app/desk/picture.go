package desk

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"image"
	"image/color"
	"math"
	"slices"
	"sort"
	"strings"
	"sync"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/appendix"
	"groundtally/app/desk/core"
	"groundtally/app/desk/mapview"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/tiles"
	"groundtally/app/live"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/geo/crs"
	"groundtally/geo/formats/gridfile"
	"groundtally/geo/formats/worldfile"
	"groundtally/scoring"
)

// picture is the map with what the window puts on it: colours, marks, legend.
type picture struct {
	w     *Window
	m     *mapview.Map
	shade *widget.Select
	under *widget.Check // shows the backdrop; hidden where the study has none
	keys  []string      // behind the options of shade
	all   fyne.CanvasObject
	boxed []string

	ended sync.Once
	life  context.Context // ends with the picture
	stop  context.CancelFunc

	ground   *tiles.Ground
	contents string             // of the ground shown or being made
	making   context.CancelFunc // of the ground being made
	lit      lit                // what the relief shown or being made is of
	lighting context.CancelFunc // of the relief being made
	hung     hung               // what the backdrop shown or being made is of
	hanging  context.CancelFunc // of the backdrop being made
	wanted   *shadeJob          // newest colouring asked for
	busy     bool
	around   map[string]*run.Surroundings // by candidate, of the results shown
	zones    []geo.LonLatGeometry         // land left, drawn besides
	of       *run.Results
}

// tileBytes is the memory for tiles beyond those in view. Drawing one anew takes a millisecond or two.
const tileBytes = 24 << 20

func newPicture(w *Window) *picture {
	p := &picture{w: w, around: map[string]*run.Surroundings{}}
	p.life, p.stop = context.WithCancel(context.Background())
	p.m = mapview.New(mapview.Options{Do: w.do, MaxTileBytes: tileBytes})
	p.m.OnSelect = func(parcel string, add bool) {
		if parcel == "" {
			w.core.Choose()
			return
		}
		w.core.ChooseParcel(parcel, add)
	}
	p.m.OnBox = p.box
	p.m.OnHover = p.words
	p.shade = widget.NewSelect(nil, nil)
	p.shade.PlaceHolder = "Score"
	p.under = widget.NewCheck("Backdrop", func(on bool) {
		w.app.Preferences().SetBool(backdropKey, on)
		p.hang()
	})
	p.under.Checked = w.app.Preferences().BoolWithFallback(backdropKey, true)
	p.under.Hide()
	height := canvas.NewRectangle(color.Transparent) // of the row, whether the switch is there or not, so that the map stays
	height.SetMinSize(fyne.NewSize(1, p.under.MinSize().Height))
	head := container.New(layout.NewCustomPaddedLayout(6, 2, 12, 8), container.NewBorder(nil, nil, widgets.Faint("Map shows").Hinted("Parcels are shaded by the score of their best candidate under the chosen voice, or by any consequence of that candidate. Each class of the legend holds about as many parcels as the others.").Wide(), p.under, container.NewStack(height, p.shade)))
	p.all = container.NewBorder(head, nil, nil, nil, p.m)
	return p
}

// close ends all drawing. It may be called from any goroutine, and again.
func (p *picture) close() {
	p.ended.Do(func() {
		p.stop()
		p.m.Close()
	})
}

func (p *picture) changed(ch core.Change) {
	if ch&core.LookChanged != 0 {
		if p.w.theme.Dark(p.w.app.Settings().ThemeVariant()) {
			p.m.SetLook(tiles.DarkLook())
		} else {
			p.m.SetLook(tiles.LightLook())
		}
	}
	if ch&core.StudyChanged != 0 {
		p.options()
		p.renew()
	}
	if ch&(core.StudyChanged|core.RankingChanged|core.ShadeChanged|core.LookChanged) != 0 {
		p.colour()
	}
	if ch&(core.StudyChanged|core.SelectionChanged) != 0 {
		p.mark()
	}
}

// options fills the choice of what shades the map.
func (p *picture) options() {
	if p.keys != nil {
		return
	}
	titles := []string{"Score under the voice"}
	p.keys = []string{""}
	for _, account := range scoring.Accounts() {
		for _, k := range p.w.parts.Params.Keys() {
			if k.Account != account {
				continue
			}
			title := strings.ToUpper(string(account[:1])) + string(account[1:]) + " · " + k.Title
			if u := present.Unit(k.Unit); u != "" {
				title += ", " + u
			}
			p.keys, titles = append(p.keys, k.Key), append(titles, title)
		}
	}
	p.shade.SetOptions(titles)
	p.shade.SetSelectedIndex(0)
	p.shade.OnChanged = func(string) {
		if i := p.shade.SelectedIndex(); i >= 0 {
			p.w.core.SetShade(p.keys[i])
		}
	}
}

// renew makes the ground of the map anew when layers changed, in the background; the newest counts.
func (p *picture) renew() {
	v := p.w.core.View()
	if v.Contents == p.contents || p.making != nil && p.ground == nil {
		return // the first ground is shown before newer layers, which may come faster than it is made
	}
	p.contents = v.Contents
	if p.making != nil {
		p.making()
	}
	ctx, cancel := context.WithCancel(p.life)
	p.making = cancel
	store := p.w.core.Session.Study().Store()
	again := p.ground != nil
	go func() {
		if again { // several layers may come one after the other
			select {
			case <-ctx.Done():
				return
			case <-time.After(300 * time.Millisecond):
			}
		}
		layers, err := appendix.MapLayers(ctx, v.Snap, run.StoreLoader(store))
		var g *tiles.Ground
		if err == nil {
			out := make([]tiles.Layer, len(layers))
			for i, l := range layers {
				out[i] = tiles.Layer{Role: l.Role, Features: make([]tiles.Feature, len(l.Features))}
				for j, f := range l.Features {
					out[i].Features[j] = tiles.Feature{ID: f.ID, Name: f.Name, Class: f.Class, Rank: f.Rank, Geometry: f.Geometry}
				}
			}
			g, err = tiles.NewGround(ctx, out)
		}
		p.w.do(func() {
			if ctx.Err() != nil {
				return
			}
			cancel()
			p.making = nil
			if err != nil {
				p.contents = "" // so that the next change tries again
				p.w.core.Fail("draw the map", err)
				return
			}
			first := p.ground == nil || p.ground.Parcels() == 0
			view := p.m.View()
			p.ground = g
			p.m.SetGround(g)
			if !first {
				p.m.SetView(view)
			}
			p.colour()
			p.mark()
			p.release()
			p.light(v.Snap, store)
			p.hang()
			p.renew() // layers that came meanwhile
		})
	}()
}

// lit is all that a relief depends on.
type lit struct {
	digest, crs string // of the terrain; none when empty
	plane       tiles.Plane
	extent      geo.Extent
}

// light puts the relief of the terrain under the map. It is made in the background after the ground is shown.
func (p *picture) light(snap *study.Snapshot, store study.Store) {
	g := p.ground
	want := lit{plane: g.Plane(), extent: g.Extent()}
	i := slices.IndexFunc(snap.Layers, func(rec study.LayerRecord) bool { return rec.Kind == "raster" && rec.Role == "terrain" })
	if i >= 0 {
		want.digest, want.crs = snap.Layers[i].Digest, snap.Layers[i].CRS
	}
	if want == p.lit {
		return
	}
	p.lit = want
	if p.lighting != nil {
		p.lighting()
	}
	ctx, cancel := context.WithCancel(p.life)
	p.lighting = cancel
	go func() {
		var r *tiles.Relief
		if i >= 0 {
			r = relief(ctx, g, snap.Layers[i], store)
		}
		p.w.do(func() {
			if ctx.Err() == nil {
				cancel()
				p.m.SetRelief(r)
			}
		})
	}()
}

// relief makes the relief of a terrain. A terrain that cannot be read gives none: the computing, which needs
// it more, says what is wrong with it.
func relief(ctx context.Context, g *tiles.Ground, rec study.LayerRecord, store study.Store) *tiles.Relief {
	v, err := run.StoreLoader(store)(ctx, rec.Digest)
	if err != nil {
		return nil
	}
	heights, _, _, err := gridfile.Decode(ctx, v.Media, rec.File, v.Blob)
	if err != nil {
		return nil
	}
	at, err := crs.NewTransform(rec.CRS)
	if err != nil {
		return nil
	}
	r, _ := tiles.NewRelief(ctx, g, heights, at)
	return r
}

// hung is all that a backdrop depends on.
type hung struct {
	pictures string // digests and reference systems; none when empty
	plane    tiles.Plane
	extent   geo.Extent
}

// hang puts the pictures of the ground under the map, unless they are switched off. They are decoded in the
// background after the ground is shown.
func (p *picture) hang() {
	g, v := p.ground, p.w.core.View()
	if g == nil || v == nil {
		return
	}
	var recs []study.LayerRecord
	var names []string
	want := hung{plane: g.Plane(), extent: g.Extent()}
	for _, rec := range v.Snap.LayersOf(study.BackdropRole) {
		recs = append(recs, rec)
		if who := rec.Credit().Attribution; !slices.Contains(names, who) {
			names = append(names, who)
		}
	}
	if shown := len(recs) > 0; shown != p.under.Visible() {
		if p.under.Show(); !shown {
			p.under.Hide()
		}
		p.all.Refresh()
	}
	if !p.under.Checked {
		recs = nil
	}
	for _, rec := range recs {
		want.pictures += rec.Digest + " " + rec.CRS + " " + rec.Credit().Attribution + "\n"
	}
	if want == p.hung {
		return
	}
	p.hung = want
	if p.hanging != nil {
		p.hanging()
	}
	ctx, cancel := context.WithCancel(p.life)
	p.hanging = cancel
	if len(recs) == 0 {
		p.m.SetBackdrop(nil, "")
		return
	}
	load := run.StoreLoader(p.w.core.Session.Study().Store())
	go func() {
		b, err := backdrop(ctx, g, recs, load)
		p.w.do(func() {
			if ctx.Err() != nil {
				return
			}
			cancel()
			if err != nil {
				p.w.foot.tell("The backdrop cannot be shown: " + present.Problem(err))
			}
			if b == nil {
				names = nil // nothing of them is seen
			}
			p.m.SetBackdrop(b, strings.Join(names, "; "))
		})
	}()
}

// backdrop decodes pictures of a study.
func backdrop(ctx context.Context, g *tiles.Ground, recs []study.LayerRecord, load run.Loader) (*tiles.Backdrop, error) {
	var sheets []tiles.Sheet
	for _, rec := range recs {
		// The bytes are read again when the picture is decoded, so that those of one alone are held at a time.
		bytesOf := func() (*bytes.Reader, error) {
			v, err := load(ctx, rec.Digest)
			if err != nil {
				return nil, fmt.Errorf("%s: %w", rec.Name, err)
			}
			return bytes.NewReader(v.Blob), nil
		}
		r, err := bytesOf()
		if err != nil {
			return nil, err
		}
		one := tiles.Sheet{Open: func() (image.Image, error) {
			r, err := bytesOf()
			if err != nil {
				return nil, err
			}
			return worldfile.Picture(r, r.Size(), worldfile.Options{File: rec.File})
		}}
		if one.Info, err = worldfile.Look(r, r.Size(), worldfile.Options{File: rec.File}); err != nil {
			return nil, err
		}
		place, err := worldfile.OfMedia(rec.Media)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", rec.Name, err)
		}
		if place != nil {
			one.Info.World = *place
		}
		if one.At, err = crs.NewTransform(rec.CRS); err != nil {
			return nil, fmt.Errorf("%s: %w", rec.Name, err)
		}
		sheets = append(sheets, one)
	}
	return tiles.NewBackdrop(ctx, g, sheets)
}

// release lets the computing begin once the map is drawn for the first time.
func (p *picture) release() {
	s := p.w.core.Session
	if p.m.Settled() {
		s.Release()
		return
	}
	time.AfterFunc(20*time.Millisecond, func() {
		p.w.do(func() {
			if p.w.core.Session == s {
				p.release()
			}
		})
	})
}

// shadeJob is all that colouring reads, so that it can be done on another goroutine.
type shadeJob struct {
	view    *live.View
	ranking *live.Ranking
	ground  *tiles.Ground
	palette draw.Palette
	key     string
	info    run.KeyInfo
	voice   string
}

// shaded is a colouring with its legend.
type shaded struct {
	shading tiles.Shading
	title   string
	legend  []mapview.LegendEntry
}

// colour has the parcels coloured anew, off the window's goroutine; the newest counts.
func (p *picture) colour() {
	c := p.w.core
	v := c.View()
	if v == nil || p.ground == nil || c.Ranking() == nil && c.Ordering() {
		return // it is coloured once the best of each site is known
	}
	p.wanted = &shadeJob{view: v, ranking: c.Ranking(), ground: p.ground, palette: c.Palette(), key: c.Shade(), info: c.Info(c.Shade())}
	if c.Voice() != "" {
		p.wanted.voice = c.VoiceTitle(c.Voice())
	}
	if p.busy {
		return
	}
	p.busy = true
	go p.colouring(p.wanted)
}

func (p *picture) colouring(job *shadeJob) {
	out := job.do()
	p.w.do(func() {
		if job.ground == p.ground {
			p.m.SetShading(out.shading)
			p.m.SetLegend(out.title, out.legend)
		}
		if p.wanted != job {
			go p.colouring(p.wanted)
			return
		}
		p.busy = false
	})
}

// shadeClasses is the number of classes of a consequence.
const shadeClasses = 6

// do gives every parcel a class.
func (j *shadeJob) do() shaded {
	n := j.ground.Parcels()
	out := shaded{shading: tiles.Shading{Class: make([]uint8, n), Over: make([]bool, n)}}
	for i := range out.shading.Class {
		out.shading.Class[i] = tiles.Bare
	}
	x := j.view.Index
	if x == nil || j.view.Results == nil {
		out.title = "Nothing is computed yet"
		return out
	}
	best := make([]int, len(x.Sites))
	for site := range best {
		best[site] = j.view.Best(j.ranking, site)
	}
	values := make([]float64, n)
	known := make([]bool, n)
	anyUnknown, anyOver, anyBare, anyNotComputed, anyNone := false, false, false, false, false
	for i := range n {
		site, ok := x.SiteOfParcel(j.ground.ID(i))
		if !ok || best[site] < 0 {
			anyBare = true
			anyNotComputed = anyNotComputed || !ok || strings.HasPrefix(whyBare(j.view, site), "not computed")
			continue
		}
		cand := &j.view.Results.Candidates[best[site]]
		if len(cand.OverLimit) > 0 {
			out.shading.Over[i], anyOver = true, true
		}
		var state scoring.State
		values[i], state = j.value(site, cand)
		switch state {
		case scoring.Number:
			known[i] = true
		case scoring.None, scoring.Never, scoring.Class: // known, and no number to be put into a class
			anyNone = true
		default:
			out.shading.Class[i], anyUnknown = tiles.Unknown, true
		}
	}
	bounds := j.bounds(values, known)
	classes := max(len(bounds)-1, 0)
	for i := range n {
		if !known[i] {
			continue
		}
		c := sort.SearchFloat64s(bounds, values[i])
		if c < len(bounds) && bounds[c] == values[i] {
			c++ // a class begins with its lower end
		}
		out.shading.Class[i] = uint8(min(max(c-1, 0), max(classes-1, 0)))
	}
	unit := present.Unit(j.info.Unit)
	for c := range classes {
		share := 0.5
		if classes > 1 {
			share = float64(c) / float64(classes-1)
		}
		colour := theme.Colour(j.palette.Ramp(share))
		out.shading.Colours = append(out.shading.Colours, colour)
		digits := j.decimals(bounds[0], bounds[len(bounds)-1])
		text := present.Rounded(bounds[c], digits) + " to " + present.Rounded(bounds[c+1], digits)
		if unit != "" && j.key != "" {
			text = strings.TrimSpace(present.Rounded(bounds[c], digits) + " to " + present.Rounded(bounds[c+1], digits) + " " + unit)
		}
		out.legend = append(out.legend, mapview.LegendEntry{Text: text, Sample: tiles.Coloured, Colour: colour})
	}
	if anyUnknown {
		out.legend = append(out.legend, mapview.LegendEntry{Text: "unknown", Sample: tiles.UnknownParcel})
	}
	if anyOver {
		out.legend = append(out.legend, mapview.LegendEntry{Text: "over a limit", Sample: tiles.OverLimit})
	}
	var bare []string
	if anyBare {
		bare = append(bare, "no room")
	}
	if anyNotComputed {
		bare = append(bare, "not computed")
	}
	if anyNone {
		bare = append(bare, map[bool]string{true: "held back", false: "none"}[j.key == ""])
	}
	if len(bare) > 0 {
		out.legend = append(out.legend, mapview.LegendEntry{Text: strings.Join(bare, ", "), Sample: tiles.BareParcel})
	}
	out.title = "Score, voice " + j.voice
	if j.key != "" {
		out.title = j.info.Title
	}
	return out
}

// value gives what a site is coloured by, or the state that stands in its place; None stands for a site
// whose candidates a gate holds back.
func (j *shadeJob) value(site int, cand *run.Candidate) (float64, scoring.State) {
	if j.key == "" {
		switch r := j.ranking; {
		case r == nil || r.Err != nil || r.Index != j.view.Index:
			return 0, scoring.Unknown
		case r.Best[site] < 0:
			return 0, scoring.None
		default:
			return r.Standing.Score[r.Best[site]], scoring.Number
		}
	}
	q, ok := cand.Consequence(j.key)
	if !ok {
		return 0, scoring.Unknown
	}
	return q.Central, q.State
}

// bounds gives the ends of the classes, which hold about as many parcels each.
func (j *shadeJob) bounds(values []float64, known []bool) []float64 {
	var list []float64
	for i, ok := range known {
		if ok {
			list = append(list, values[i])
		}
	}
	if len(list) == 0 {
		return nil
	}
	slices.Sort(list)
	lo, hi := list[0], list[len(list)-1]
	// Ends are rounded before parcels are put into classes, so that the legend says what the map shows.
	step := math.Pow(10, float64(-j.decimals(lo, hi)))
	out := []float64{math.Floor(lo/step) * step}
	for k := 1; k < shadeClasses; k++ {
		if x := math.Round(list[k*len(list)/shadeClasses]/step) * step; x > out[len(out)-1]+step/2 && x < hi {
			out = append(out, x)
		}
	}
	return append(out, max(math.Ceil(hi/step), math.Round(out[len(out)-1]/step)+1)*step)
}

// decimals is how fine the ends of classes are written: a hundredth of the whole span, and two decimals for
// a score.
func (j *shadeJob) decimals(lo, hi float64) int {
	if j.key == "" {
		return 2
	}
	if hi <= lo {
		hi = lo + math.Max(math.Abs(lo), 1)
	}
	return 1 - int(math.Floor(math.Log10(hi-lo)))
}

// words name a parcel under the pointer.
func (p *picture) words(parcel string) string {
	c := p.w.core
	v := c.View()
	if v == nil || v.Index == nil {
		return "Parcel " + parcel
	}
	site, ok := v.Index.SiteOfParcel(parcel)
	if !ok {
		return "Parcel " + parcel
	}
	words := "Parcel " + parcel
	if s := v.Index.Sites[site]; s != parcel {
		words += ", part of site " + s
	}
	cand := c.BestAt(site)
	if cand == nil || cand.Status != run.Fitted {
		return words + "\n" + whyBare(v, site)
	}
	words += "\nbest: " + c.PlantTitle(cand.Plant)
	if r := c.Ranking(); r != nil && r.Err == nil && r.Index == v.Index && r.Best[site] >= 0 {
		words += fmt.Sprintf("\nscore %.2f, place %d", r.Standing.Score[r.Best[site]], r.Standing.Place[r.Best[site]])
	}
	if key := c.Shade(); key != "" {
		if q, ok := cand.Consequence(key); ok {
			text := present.Cell(q)
			if q.State == scoring.Number {
				text += " " + present.Unit(q.Unit)
			}
			words += "\n" + c.Info(key).Title + ": " + strings.TrimSpace(text)
		}
	}
	if len(cand.OverLimit) > 0 {
		words += "\nover a limit"
	}
	return words
}

// whyBare says why a site has no candidate on the map.
func whyBare(v *live.View, site int) string {
	for _, i := range v.Index.Candidates[site] {
		if c := &v.Results.Candidates[i]; c.Status == run.NotComputed {
			if c.Reason != "" {
				return "not computed: " + present.Reason(c.Reason)
			}
			return "not computed"
		}
	}
	return "no room for any plant option"
}

// box keeps the parcels of a box, for making a site of them, and says what can be done.
func (p *picture) box(parcels []string) {
	p.boxed = parcels
	p.w.core.Emit(core.SelectionChanged)
	if len(parcels) > 0 {
		p.w.foot.tell(core.Counted(len(parcels), "parcel", "parcels") + " wholly in the box. Ground, Sites makes one site of several.")
	}
}

// mostAround is how many surroundings are kept.
const mostAround = 24

// sameCandidates reports whether results differ at most in their order.
func sameCandidates(a, b *run.Results) bool {
	return a == b || a != nil && b != nil && len(a.Candidates) == len(b.Candidates) && len(a.Candidates) > 0 && &a.Candidates[0] == &b.Candidates[0]
}

// mark draws the chosen candidates: their parcels, buildable area, plant, connection, distances kept.
func (p *picture) mark() {
	c := p.w.core
	v := c.View()
	if v == nil || p.ground == nil {
		return
	}
	if !sameCandidates(p.of, v.Results) || len(p.around) > mostAround {
		p.around = map[string]*run.Surroundings{}
	}
	p.of = v.Results
	var marks []tiles.Mark
	for i, cand := range c.Chosen() {
		m := tiles.Mark{Letter: core.Letter(i), Parcels: cand.Parcels}
		if f := cand.Fit; f != nil {
			m.Turbines = f.Turbines
			if !f.Tracks.Empty() {
				m.Tracks = []geo.LonLatGeometry{f.Tracks}
			}
			if !f.Panels.Empty() {
				m.Panels = []geo.LonLatGeometry{f.Panels}
			}
		}
		if n := cand.Connection; n != nil {
			m.Routes = []geo.LonLatGeometry{{Kind: geo.Lines, Parts: [][][]geo.LonLat{{{n.From, n.To}}}}}
		}
		a, asked := p.around[cand.ID()]
		if a != nil {
			m.Buildable = []geo.LonLatGeometry{a.Buildable}
			if !a.Rows.Empty() {
				m.Rows = []geo.LonLatGeometry{a.Rows}
			}
			for _, k := range a.Kept {
				m.Setbacks = append(m.Setbacks, tiles.Setback{Geometry: k.Features, RadiusM: k.DistanceM})
			}
		}
		if !asked && v.Current {
			p.ask(cand)
		}
		marks = append(marks, m)
	}
	if len(p.zones) > 0 {
		marks = append(marks, tiles.Mark{Buildable: p.zones})
	}
	p.m.SetMarks(marks)
}

// showZones draws land that is left in the district.
func (p *picture) showZones(zones []geo.LonLatGeometry) {
	p.zones = zones
	p.mark()
}

// ask finds what is drawn around a candidate, once.
func (p *picture) ask(cand *run.Candidate) {
	p.around[cand.ID()] = nil
	of := p.of
	p.w.core.Session.Around(cand, func(a *run.Surroundings, err error) {
		p.w.do(func() {
			switch {
			case of != p.of:
				return
			case err != nil:
				delete(p.around, cand.ID()) // asked again when it is next chosen
				if !errors.Is(err, context.Canceled) {
					p.w.foot.tell("The ground around " + cand.Site + " cannot be shown: " + present.Problem(err))
				}
				return
			}
			p.around[cand.ID()] = a
			p.mark()
		})
	})
}

// showParcels brings parcels into view.
func (p *picture) showParcels(ids []string) {
	if len(ids) > 0 {
		p.m.ShowParcel(ids[0])
	}
}

// showPlace brings a place into view, near enough to see a house.
func (p *picture) showPlace(at geo.LonLat) { p.m.CentreOn(at, 4) }
