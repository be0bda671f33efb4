package accounts

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/chartview"
	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// mostPatches is how many buildable patches are told one by one, the largest first.
const mostPatches = 6

// groundHere tells the terrain of a chosen candidate: heights, slope, the way it falls, ruggedness, horizon.
type groundHere struct {
	core    *core.Core
	who     *widget.Select
	ids     []string // behind the options of who
	at      string   // candidate that is told
	of      *run.Results
	source  *widgets.Line
	said    *widget.Label
	saidBox fyne.CanvasObject
	rows    *fyne.Container
	head    *fyne.Container // of the horizon
	words   *widget.Label   // the horizon for those who cannot see the picture
	picture *chartview.Picture
	all     *fyne.Container
	body    fyne.CanvasObject
	list    []run.Relief // shown
	round   int          // of the newest question; older answers are dropped
	syncing bool
}

func newGroundHere(c *core.Core) *groundHere {
	g := &groundHere{core: c, source: widgets.Faint(""), said: widgets.NewText(""), words: widgets.NewText(""), rows: container.NewVBox()}
	g.who = widget.NewSelect(nil, func(string) {
		if i := g.who.SelectedIndex(); !g.syncing && i >= 0 {
			g.at = g.ids[i]
			g.ask()
		}
	})
	g.picture = chartview.New(c, func(do func()) { go do() }, func() { g.all.Refresh() })
	title := widgets.Part("Horizon").Hinted("How high the ground stands around the middle of the site, seen from 1.5 m above it, with the curvature of the earth and the bending of light, as far as 20 km. Directions are from true north.")
	flush := func(o fyne.CanvasObject) fyne.CanvasObject { return container.New(insets{-6, -4, -6, -2}, o) } // with the lines
	g.head = container.NewVBox(space(6), title, flush(g.words), g.picture)
	g.saidBox = flush(g.said)
	g.all = container.NewVBox(g.who, g.source, g.saidBox, g.rows, g.head)
	g.body = container.NewVScroll(pad(g.all))
	g.update()
	return g
}

// update follows the chosen candidates and the results.
func (g *groundHere) update() {
	chosen, v := g.core.Chosen(), g.core.View()
	var titles []string
	g.ids = nil
	at := 0
	for i, c := range chosen {
		if c.ID() == g.at {
			at = i
		}
		g.ids, titles = append(g.ids, c.ID()), append(titles, core.Letter(i)+"  "+g.core.CandidateTitle(c))
	}
	g.syncing = true
	g.who.SetOptions(titles)
	if len(titles) > 0 {
		g.who.SetSelectedIndex(at)
	}
	g.syncing = false
	shown(len(titles) > 0, g.who)
	before := g.at
	if g.at = ""; len(g.ids) > 0 {
		g.at = g.ids[at]
	}
	if v == nil || g.at == "" {
		g.round++
		g.of = nil
		g.clear("Choose a candidate in the table or on the map.")
		return
	}
	if g.at != before || g.of != v.Results {
		g.ask()
	}
}

// clear shows words in place of figures.
func (g *groundHere) clear(words string) {
	g.list = nil
	g.said.SetText(words)
	g.rows.RemoveAll()
	g.picture.Set(nil)
	for _, o := range []fyne.CanvasObject{g.head, g.source} {
		shown(false, o)
	}
	shown(words != "", g.saidBox)
	g.all.Refresh()
}

// ask finds the terrain of the candidate on another goroutine; the newest question wins.
func (g *groundHere) ask() {
	v := g.core.View()
	i, ok := v.Index.ByID[g.at]
	if !ok {
		return
	}
	g.of = v.Results
	g.round++
	round := g.round
	g.clear("…")
	var source *study.LayerRecord
	for _, l := range v.Of.LayersOf("terrain") {
		if l.Kind == "raster" { // the first by name counts
			source = &l
			break
		}
	}
	g.core.Session.Relief(&v.Results.Candidates[i], func(list []run.Relief, err error) {
		g.core.Do(func() {
			if round == g.round {
				g.answered(list, source, err)
			}
		})
	})
}

func (g *groundHere) answered(list []run.Relief, source *study.LayerRecord, err error) {
	switch {
	case errors.Is(err, run.ErrNoTerrain) || err == nil && source == nil:
		g.clear("Unknown: the study has no layer of ground heights. Add one in the stage Ground as Ground heights.")
		return
	case err != nil:
		g.clear("Unknown: " + present.Problem(err))
		return
	case len(list) == 0 || list[0].HeightShare == 0:
		g.clear(fmt.Sprintf("Unknown: the layer %s holds no heights for this site.", source.Name))
		return
	}
	g.clear("")
	g.list = list
	from := "From the layer " + source.Name
	if source.Edition != "" {
		from += ", edition " + source.Edition
	}
	if source.Holder != "" {
		from += ", " + source.Holder
	}
	g.source.Set(from)
	g.source.Hint = from
	shown(true, g.source)
	for i, r := range list {
		if i > mostPatches {
			g.rows.Add(widgets.Faint(fmt.Sprintf("and %s", core.Counted(len(list)-i, "smaller patch", "smaller patches"))))
			break
		}
		g.tell(r)
	}
	if len(list) == 1 {
		g.rows.Add(widgets.Faint("No patch of the site is buildable with this plant option."))
	}
	shown(true, g.head)
	words := horizonWords(list[0])
	g.words.SetText(words)
	if angles := list[0].HorizonDeg; len(angles) > 0 {
		title := "Strip: the horizon of site " + list[0].Site + ". " + words
		g.picture.Set(func(p draw.Palette, width float64) *draw.Scene {
			return chart.HorizonStrip(chart.Horizon{Title: title, ID: "ground-here", Angles: angles}, p, width)
		})
	}
	g.all.Refresh()
}

// figure is a line about the terrain.
type figure struct{ label, hint, value string }

// figures writes the terrain of a site or a patch. What is not known says why.
func figures(r run.Relief) []figure {
	unknown := "unknown: there are no heights here"
	height, slope, falls, rough := unknown, unknown, unknown, unknown
	if r.MeanM != nil && r.LeastM != nil && r.MostM != nil {
		height = fmt.Sprintf("%.1f m on average, from %.1f to %.1f m", *r.MeanM, *r.LeastM, *r.MostM)
		why := "unknown: too few heights beside each other"
		slope, falls, rough = why, why, why
	}
	if r.SlopeDeg != nil && r.SteepestDeg != nil {
		slope = fmt.Sprintf("%.1f° on average, at most %.1f°", *r.SlopeDeg, *r.SteepestDeg)
		falls = "no one way: level, or it falls all ways"
	}
	if r.AspectDeg != nil {
		falls = fmt.Sprintf("%.0f°, %s; agreement %.2f", math.Mod(math.Round(*r.AspectDeg), 360), chart.Direction(*r.AspectDeg), r.AspectShare)
	}
	if r.RoughnessM != nil {
		rough = fmt.Sprintf("%.2f m", *r.RoughnessM)
	}
	out := []figure{
		{"Height", "Height of the ground in metres, as the layer counts it.", height},
		{"Slope", "The mean of the slopes of the ground, and the steepest of its cells.", slope},
		{"Falls to", "The mean direction in which the ground falls, from true north. The agreement is 1 when all of it falls that way and 0 when the ways cancel out.", falls},
		{"Ruggedness", "How far the height of a cell differs from those around it, on average.", rough},
	}
	if r.HeightShare < 0.9995 {
		out = append(out, figure{"Known", "The share of the area with known heights; the figures are of that share.", fmt.Sprintf("heights for %.0f %% of the area", math.Floor(100*r.HeightShare))})
	}
	return out
}

func (g *groundHere) tell(r run.Relief) {
	name := "Site " + r.Site
	if r.Patch > 0 {
		name = fmt.Sprintf("Buildable patch %d", r.Patch)
	}
	g.rows.Add(space(4))
	g.rows.Add(widgets.Part(name + " · " + present.Hectares(r.Ha) + " ha"))
	for _, f := range figures(r) {
		label, value := widgets.Faint(f.label).Hinted(f.hint), widgets.NewLine(f.value)
		if strings.HasPrefix(f.value, "unknown") {
			g.rows.Add(widgets.Fields(8, []float32{110, 12, 0}, label, widgets.NewHatch(), value))
			continue
		}
		g.rows.Add(widgets.Fields(8, []float32{110, 0}, label, value))
	}
}

// horizonWords tells the horizon in words: where it is highest, and how far it is known.
func horizonWords(r run.Relief) string {
	top, at, missing := math.Inf(-1), 0.0, 0
	for i, a := range r.HorizonDeg {
		switch {
		case a == nil:
			missing++
		case *a > top:
			top, at = *a, 360*float64(i)/float64(len(r.HorizonDeg))
		}
	}
	if len(r.HorizonDeg) == 0 || math.IsInf(top, -1) {
		return "Unknown: there are no heights at the middle of the site."
	}
	words := fmt.Sprintf("Highest towards %.0f°, %s: %.1f° above level.", at, chart.Direction(at), top)
	if missing > 0 {
		words += fmt.Sprintf(" Unknown in %d of %d directions.", missing, len(r.HorizonDeg))
	}
	if r.HorizonKnown < 0.995 {
		words += fmt.Sprintf(" Heights are known for at least %.0f %% of the 20 km in every direction; beyond them it may be higher.", math.Floor(100*r.HorizonKnown))
	}
	return words
}
