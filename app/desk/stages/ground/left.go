package ground

import (
	"context"
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

// leftPane tells what the rules leave of the whole district, and what one rule does when it changes.
type leftPane struct {
	c       *core.Core
	content fyne.CanvasObject

	plants   []string // behind the options
	plant    *widget.Select
	find     *widget.Button
	stopping *widget.Button
	save     *widget.Button
	clear    *widget.Button
	bar      *widget.ProgressBar
	said     *widget.Label
	table    *fyne.Container
	zones    *widget.List
	zoneHead *widgets.Line

	keys           []string // of the rules that can be swept
	rule           *widget.Select
	from, to, step *widget.Entry
	sweep          *widget.Button
	steps          *fyne.Container

	left  []run.Left
	shown []run.Zone
	of    *study.Snapshot // that left is of
	stop  func()
	round int
}

func newLeftPane(c *core.Core) *leftPane {
	p := &leftPane{c: c, bar: widget.NewProgressBar(), said: widgets.NewText(""), table: container.NewVBox(), zoneHead: widgets.Part(""), from: widget.NewEntry(), to: widget.NewEntry(), step: widget.NewEntry(), steps: container.NewVBox()}
	p.plant = widget.NewSelect(nil, func(string) { p.offer() })
	p.plant.PlaceHolder = "Plant option"
	p.find = widget.NewButton("Find the land left", p.compute)
	p.find.Importance = widget.HighImportance
	p.stopping = widget.NewButton("Stop", func() {
		if p.stop != nil {
			p.stop()
		}
	})
	p.save = widget.NewButton("Write as a layer…", p.write)
	p.clear = widget.NewButton("Clear the map", func() { c.ShowZones(nil) })
	p.zones = widget.NewList(func() int { return len(p.shown) }, func() fyne.CanvasObject { return widgets.NewLine("") }, func(i widget.ListItemID, o fyne.CanvasObject) {
		z := p.shown[i]
		o.(*widgets.Line).Set(zoneWords(i, z))
	})
	p.zones.HideSeparators = true
	p.zones.OnSelected = func(i widget.ListItemID) {
		p.zones.UnselectAll()
		c.ShowPlace(p.shown[i].Centre)
	}
	p.rule = widget.NewSelect(nil, func(string) { p.suggest() })
	p.rule.PlaceHolder = "A rule with a number"
	p.from.SetPlaceHolder("from")
	p.to.SetPlaceHolder("to")
	p.step.SetPlaceHolder("step")
	p.sweep = widget.NewButton("Try the values", p.trySteps)
	head := container.NewVBox(
		widgets.Fields(6, []float32{0, 150}, p.plant, p.find),
		container.NewStack(p.bar), p.said,
	)
	body := container.NewVBox(head, p.table, container.NewHBox(p.save, p.clear), gap(8),
		widgets.Part("One rule, several values").Hinted("Everything else stays as it is. Each value tells land, zones, candidates with a plant, their energy, and who comes first."),
		widgets.Fields(6, []float32{0, 62, 62, 62}, p.rule, p.from, p.to, p.step), container.NewHBox(p.sweep, p.stopping), p.steps)
	scroll := container.NewVScroll(container.New(layout.NewCustomPaddedLayout(0, 0, 0, 14), body))
	p.content = padded(container.NewBorder(nil, container.NewVBox(p.zoneHead, container.New(atLeast{height: 120}, p.zones)), nil, nil, scroll))
	p.rest()
	p.changed()
	return p
}

// atLeast gives its object a height.
type atLeast struct{ height float32 }

func (l atLeast) MinSize([]fyne.CanvasObject) fyne.Size { return fyne.NewSize(1, l.height) }

func (l atLeast) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	for _, o := range objects {
		o.Move(fyne.NewPos(0, 0))
		o.Resize(size)
	}
}

func hectares(x float64) string { return present.Hectares(x) }

// changed offers the plant options, and says when what is shown is of an earlier state.
func (p *leftPane) changed() {
	snap := p.c.View().Snap
	var titles []string
	p.plants = snap.Plants()
	for _, id := range p.plants {
		titles = append(titles, p.c.PlantTitle(id))
	}
	p.plant.SetOptions(titles)
	if p.plant.SelectedIndex() < 0 && len(titles) > 0 {
		p.plant.SetSelectedIndex(0)
	}
	if len(titles) == 0 {
		p.find.Disable()
		p.said.SetText("The study has no plant option yet; rules belong to one.")
	} else if p.stop == nil {
		p.find.Enable()
	}
	if p.of != nil && !run.OnlyWeighing(p.of, snap) && p.stop == nil {
		p.said.SetText("The study has changed since. Find the land left again to see what it leaves now.")
	}
	p.offer()
}

// option gives the chosen plant option.
func (p *leftPane) option() (string, bool) {
	if i := p.plant.SelectedIndex(); i >= 0 && i < len(p.plants) {
		return p.plants[i], true
	}
	return "", false
}

// offer lists the rules in force that have a number.
func (p *leftPane) offer() {
	plant, ok := p.option()
	if !ok {
		return
	}
	snap := p.c.View().Snap
	technology := snap.Text("plant." + plant + ".technology")
	names := []string{plant, technology, "wind", "solar"}
	if technology == "wind" {
		names = names[:3]
	} else if technology != "wind_solar" {
		names = []string{plant, technology, "solar"}
	}
	p.keys = nil
	var titles []string
	for _, key := range snap.Keys() {
		s, _, in := snap.Lookup(key)
		if _, number := s.Number(); !in || !number || !strings.HasPrefix(key, "rule.") {
			continue
		}
		last := key[strings.LastIndexByte(key, '.')+1:]
		for _, n := range names {
			if strings.HasPrefix(last, n+"_") && !strings.Contains(strings.TrimPrefix(last, n+"_"), "_") {
				p.keys = append(p.keys, key)
				titles = append(titles, ruleWords(key)+" ("+present.Unit(s.Unit)+")")
				break
			}
		}
	}
	if strings.Join(titles, "\n") != strings.Join(p.rule.Options, "\n") {
		p.rule.ClearSelected()
		p.rule.SetOptions(titles)
	}
}

// ruleWords writes the key of a rule: "distance from dwellings, wind".
func ruleWords(key string) string {
	bits := strings.Split(key, ".")
	last := bits[len(bits)-1]
	if i := strings.LastIndexByte(last, '_'); i > 0 {
		last = last[:i]
	}
	what := strings.ReplaceAll(bits[1], "_", " ")
	if bits[1] == "setback" && len(bits) > 3 {
		what = present.Rule("setback:" + bits[2])
		if more := strings.Join(bits[3:len(bits)-1], " "); more != "" {
			what += ", " + strings.ReplaceAll(more, "_", " ")
		}
	}
	return what + ", " + strings.ReplaceAll(last, "_", " ")
}

// suggest fills in values around the present one.
func (p *leftPane) suggest() {
	i := p.rule.SelectedIndex()
	if i < 0 || i >= len(p.keys) {
		return
	}
	x, ok := p.c.View().Snap.Number(p.keys[i])
	if !ok || x <= 0 {
		x = 1
	}
	text := func(v float64) string { return strconv.FormatFloat(v, 'g', 4, 64) }
	p.from.SetText(text(x / 2))
	p.to.SetText(text(x * 1.5))
	p.step.SetText(text(x / 4))
}

// rest shows that nothing is under way.
func (p *leftPane) rest() {
	p.stop = nil
	p.bar.Hide()
	p.stopping.Disable()
	p.find.Enable()
	p.sweep.Enable()
	if len(p.left) == 0 {
		p.save.Disable()
		p.clear.Disable()
	} else {
		p.save.Enable()
		p.clear.Enable()
	}
}

// begin shows that something is under way and gives what tells its progress.
func (p *leftPane) begin(words string) run.Progress {
	p.round++
	round := p.round
	p.said.SetText(words)
	p.bar.SetValue(0)
	p.bar.Show()
	p.stopping.Enable()
	p.find.Disable()
	p.sweep.Disable()
	last := -1
	return func(_ string, done, total int) {
		if percent := 100 * done / max(total, 1); percent != last {
			last = percent
			p.c.Do(func() {
				if p.round == round {
					p.bar.SetValue(float64(done) / float64(max(total, 1)))
				}
			})
		}
	}
}

func (p *leftPane) compute() {
	plant, ok := p.option()
	if !ok {
		return
	}
	of := p.c.View().Snap
	p.stop = p.c.Session.LandLeft(plant, p.begin("Working through the district…"), func(list []run.Left, err error) {
		p.c.Do(func() {
			if err != nil {
				p.failed(err)
				return
			}
			p.left, p.of = list, of
			p.rest()
			p.show()
		})
	})
}

func (p *leftPane) failed(err error) {
	p.rest()
	if errors.Is(err, context.Canceled) {
		p.said.SetText("Stopped.")
		return
	}
	p.said.SetText(inWindow.Replace(present.Problem(err)))
}

// show tells what was found and draws it.
func (p *leftPane) show() {
	p.table.RemoveAll()
	p.shown = nil
	var drawn []geo.LonLatGeometry
	var words []string
	for _, l := range p.left {
		place := "the district"
		if l.Hull {
			place = "the hull of the parcels, since the study has no district boundary"
		}
		part := ""
		if l.Part != "" {
			part = " for the " + l.Part + " part"
		}
		words = append(words, fmt.Sprintf("Of %s ha of %s, %s ha are left%s, in %s.", hectares(l.DistrictHa), place, hectares(l.LeftHa), part, core.Counted(len(l.Zones), "zone", "zones")))
		if len(l.Incomplete) > 0 {
			words = append(words, "Rules that are not set took nothing: "+ruleNames(l.Incomplete)+".")
		}
		grid := container.New(columns{label: 230}, widgets.Faint("rule"), rowOf("takes ha", "alone", "shared", theme.Faint))
		for _, t := range l.Rules {
			grid.Add(widgets.NewLine(present.Rule(t.Rule)))
			grid.Add(rowOf(hectares(t.AloneHa+t.SharedHa), hectares(t.AloneHa), hectares(t.SharedHa), ""))
		}
		grid.Add(widgets.NewLine("several rules, counted once"))
		grid.Add(rowOf(hectares(l.SharedHa), "", "", ""))
		grid.Add(widgets.NewLine("too narrow or too small"))
		grid.Add(rowOf(hectares(l.ShapeHa), "", "", ""))
		p.table.Add(grid)
		p.shown = append(p.shown, l.Zones...)
		for _, z := range l.Zones {
			drawn = append(drawn, z.Outline)
		}
	}
	words = append(words, "The map veils it and draws its edges.")
	p.said.SetText(strings.Join(words, " "))
	p.zoneHead.Set("Zones, the largest first; a click shows one on the map")
	p.zones.Refresh()
	p.c.ShowZones(drawn)
	p.content.Refresh()
}

func ruleNames(list []string) string {
	var out []string
	for _, n := range list {
		out = append(out, present.Rule(n))
	}
	return strings.Join(out, ", ")
}

// rowOf is three numbers beside each other.
func rowOf(a, b, c string, colour fyne.ThemeColorName) fyne.CanvasObject {
	row := container.NewGridWithColumns(3)
	for _, text := range []string{a, b, c} {
		l := widgets.NewLine(text)
		l.Align = fyne.TextAlignTrailing
		if colour != "" {
			l.Colour = colour
		}
		row.Add(l)
	}
	return row
}

// most steps of a sweep in the window.
const mostSteps = 40

func (p *leftPane) trySteps() {
	plant, ok := p.option()
	i := p.rule.SelectedIndex()
	if !ok || i < 0 || i >= len(p.keys) {
		p.said.SetText("Choose a plant option and a rule first.")
		return
	}
	var x [3]float64
	for n, e := range []*widget.Entry{p.from, p.to, p.step} {
		v, err := strconv.ParseFloat(strings.ReplaceAll(strings.TrimSpace(e.Text), ",", "."), 64)
		if err != nil || math.IsNaN(v) || math.IsInf(v, 0) {
			p.said.SetText("Give from, to and step as numbers.")
			return
		}
		x[n] = v
	}
	n := math.Floor((x[1]-x[0])/x[2] + 1e-9)
	if !(x[2] > 0) || n < 0 || n >= mostSteps {
		p.said.SetText(fmt.Sprintf("Give from, to and step so that there are 1 to %d values upwards.", mostSteps))
		return
	}
	var values []float64
	for k := range int(n) + 1 {
		values = append(values, x[0]+float64(k)*x[2])
	}
	key := p.keys[i]
	def, _ := p.c.Parts.Catalog.Definition(key)
	p.steps.RemoveAll()
	grid := container.New(columns{label: 90}, widgets.Faint(present.Unit(def.Unit)), stepRow("left ha", "zones", "with a plant", "MWh/yr", "first", theme.Faint))
	p.steps.Add(grid)
	voice := p.c.Voice()
	p.stop = p.c.Session.Sweep(plant, key, values, p.begin("Trying the values…"), func(st run.Step) {
		p.c.Do(func() {
			energy := "unknown"
			if st.EnergyKnown > 0 || st.Fitted == 0 {
				energy = present.Figure(st.EnergyMWh, st.EnergyMWh, st.EnergyMWh)
			}
			if st.EnergyKnown < st.Fitted {
				energy += " *"
			}
			first := st.First[voice]
			if first == run.NoSite {
				first = "do nothing"
			}
			grid.Add(widgets.NewLine(present.Exact(st.Value)))
			grid.Add(stepRow(hectares(st.LeftHa), strconv.Itoa(len(st.Zones)), strconv.Itoa(st.Fitted), energy, first, ""))
			p.content.Refresh()
		})
	}, func(err error) {
		p.c.Do(func() {
			if err != nil {
				p.failed(err)
				return
			}
			p.rest()
			p.said.SetText("Energy: first year of all candidates with a plant of this option, each by itself; first: under the voice " + p.c.VoiceTitle(voice) + ". A star marks a sum without candidates whose energy is unknown. Nothing of the study was changed.")
		})
	})
}

func stepRow(a, b, c, d, e string, colour fyne.ThemeColorName) fyne.CanvasObject {
	var cells []fyne.CanvasObject
	for i, text := range []string{a, b, c, d, e} {
		l := widgets.NewLine(text)
		if i < 4 {
			l.Align = fyne.TextAlignTrailing
		}
		if colour != "" {
			l.Colour = colour
		}
		cells = append(cells, l)
	}
	return widgets.Fields(8, []float32{70, 50, 86, 90, 0}, cells...)
}

// write saves the zones as a layer.
func (p *leftPane) write() {
	l := run.ZonesLayer(p.left)
	d := dialog.NewFileSave(saved(p.c.Fail, func(path string) {
		go func() {
			err := p.c.Parts.Export(context.Background(), path, []*geo.Layer{l}, true)
			p.c.Do(func() {
				if err != nil {
					p.c.Fail("write the layer", err)
					return
				}
				p.c.Tell("Wrote " + filepath.Base(path) + ".")
			})
		}()
	}), p.c.Window)
	d.SetFileName("land-left.geojson")
	d.Show()
}

// saved gives what a dialog for saving calls: then with the path that was chosen. The file is written anew there,
// wholly or not at all.
func saved(fail func(what string, err error), then func(path string)) func(fyne.URIWriteCloser, error) {
	return func(w fyne.URIWriteCloser, err error) {
		switch {
		case err != nil:
			fail("write the file", err)
		case w != nil:
			path := w.URI().Path()
			_ = w.Close()
			then(path)
		}
	}
}

// zoneWords writes a piece of the land left in a line of the list.
func zoneWords(i int, z run.Zone) string {
	return fmt.Sprintf("%d   %s ha   near %s", i+1, hectares(z.Ha), present.Place(z.Centre))
}
