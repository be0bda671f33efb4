package weigh

import (
	"slices"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring/criteria"
)

const allPlants = "All plant options"

// scatterPane shows any two consequences of the candidates against each other.
type scatterPane struct {
	s       *stage
	keys    []run.KeyInfo // to choose from
	plants  []string
	x, y    *widget.Select
	plant   *widget.Select
	picture *picture
	all     *fyne.Container
}

func newScatter(s *stage) *scatterPane {
	p := &scatterPane{s: s}
	redraw := func(string) { p.draw() }
	p.x, p.y, p.plant = widget.NewSelect(nil, redraw), widget.NewSelect(nil, redraw), widget.NewSelect(nil, redraw)
	scroll := container.NewVScroll(nil)
	p.picture = newPicture(s.c, scroll.Refresh)
	p.picture.pressed = func(id string, add bool) {
		if add {
			s.c.Toggle(id)
		} else {
			s.c.Choose(id)
		}
	}
	// A scatter is about 0.62 times as high as it is wide, with axes and legend under it; what does not fit
	// the height is made narrower, so that both axes are in view.
	p.picture.fit = func(width float32) float32 {
		return min(width, max((scroll.Size().Height-130)/0.62+60, 400))
	}
	scroll.Content = container.New(inset{right: 12}, p.picture)
	across, up, only := widgets.Faint("Across"), widgets.Faint("Up"), widgets.Faint("Plant")
	choice := container.New(free{
		min: func() fyne.Size { return fyne.NewSize(380, 2*p.x.MinSize().Height+4) },
		place: func(size fyne.Size) {
			h := p.x.MinSize().Height
			half := (size.Width - 16) / 2
			put(across, 0, 0, 44, h)
			put(p.x, 46, 0, half-46, h)
			put(up, half+16, 0, 34, h)
			put(p.y, half+52, 0, half-36, h)
			put(only, 0, h+4, 44, h)
			put(p.plant, 46, h+4, half-46, h)
		},
	}, across, p.x, up, p.y, only, p.plant)
	p.all = container.NewBorder(choice, nil, nil, nil, scroll)
	return p
}

func (p *scatterPane) object() fyne.CanvasObject { return p.all }

func (p *scatterPane) changed(core.Change) {
	v := p.s.c.View()
	if v == nil || v.Results == nil {
		return
	}
	p.offer()
	p.draw()
}

// offer fills the choices: what is weighed first, then everything else.
func (p *scatterPane) offer() {
	c, v := p.s.c, p.s.c.View()
	var keys []run.KeyInfo
	weighed := map[string]bool{}
	if v.Board != nil {
		for _, k := range v.Board.Keys {
			keys, weighed[k.Info.Key] = append(keys, k.Info), true
		}
	}
	for _, k := range c.Parts.Params.Keys() {
		if !weighed[k.Key] {
			keys = append(keys, k)
		}
	}
	titles := keyTitles(keys)
	if !slices.Equal(titles, p.x.Options) {
		at := func(s *widget.Select, otherwise int) string {
			if slices.Contains(titles, s.Selected) {
				return s.Selected
			}
			return titles[min(otherwise, len(titles)-1)]
		}
		p.keys = keys
		p.x.Selected, p.y.Selected = at(p.x, 0), at(p.y, 1)
		p.x.Options, p.y.Options = titles, titles
		p.x.Refresh()
		p.y.Refresh()
	}
	plants := v.Snap.Plants()
	names := []string{allPlants}
	for _, id := range plants {
		names = append(names, c.PlantTitle(id))
	}
	if !slices.Equal(names, p.plant.Options) {
		p.plants, p.plant.Options = plants, names
		if !slices.Contains(names, p.plant.Selected) {
			p.plant.Selected = allPlants
		}
		p.plant.Refresh()
	}
}

// keyTitles names consequences to choose from; of two with one title the later says its unit.
func keyTitles(keys []run.KeyInfo) []string {
	titles := make([]string, len(keys))
	for i, k := range keys {
		if titles[i] = k.Title; slices.Contains(titles[:i], k.Title) {
			titles[i] += " (" + present.UnitWords(k.Unit) + ")"
		}
	}
	return titles
}

func (p *scatterPane) draw() {
	v := p.s.c.View()
	ix, iy := p.x.SelectedIndex(), p.y.SelectedIndex()
	if v == nil || v.Results == nil || ix < 0 || iy < 0 {
		return
	}
	keys := [2]run.KeyInfo{p.keys[ix], p.keys[iy]}
	var better [2]chart.Better
	for i, k := range keys {
		if c, ok := criterion(p.s.c.Parts.Catalog, k.Key); ok && c.Better == criteria.Less {
			better[i] = chart.Less
		} else if ok {
			better[i] = chart.More
		}
	}
	plant := ""
	if i := p.plant.SelectedIndex(); i > 0 {
		plant = p.plants[i-1]
	}
	letters := map[string]string{}
	for i, id := range p.s.c.ChosenIDs() {
		letters[id] = core.Letter(i)
	}
	results, titles := v.Results, plantTitles(p.s.c)
	p.picture.set(func(palette draw.Palette, width float64) *draw.Scene {
		return chart.Scatter(pictures.Cloud(results, keys, better, plant, titles, letters), palette, width)
	})
}
