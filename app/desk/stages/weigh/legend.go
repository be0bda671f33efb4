package weigh

import (
	"slices"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/run"
)

// legend says which colour of a bar is which consequence, in as many lines as that takes.
type legend struct {
	widget.BaseWidget
	titles []string
	marks  []fyne.CanvasObject
	lines  []*widgets.Line
}

const legendLine = 17

// flow tells the place of every entry at a width, and gives the height that all take.
func (l *legend) flow(width float32, place func(i int, x, y, width float32)) float32 {
	x, y := float32(0), float32(0)
	for i, line := range l.lines {
		w := float32(textWidth(line))
		if x > 0 && x+14+w > width {
			x, y = 0, y+legendLine
		}
		if place != nil {
			place(i, x, y, min(w, width-x-14))
		}
		x += 14 + w + 14
	}
	return y + legendLine
}

func newLegend() *legend {
	l := &legend{}
	l.ExtendBaseWidget(l)
	return l
}

// set takes over the keys; it tells whether there was anything new.
func (l *legend) set(keys []run.BoardKey) bool {
	titles := make([]string, len(keys))
	for i, k := range keys {
		titles[i] = k.Info.Title
	}
	if slices.Equal(titles, l.titles) {
		return false
	}
	l.titles, l.marks, l.lines = titles, nil, nil
	for i, k := range keys {
		l.marks = append(l.marks, canvas.NewRectangle(theme.Colour(categoryOf(i))))
		l.lines = append(l.lines, widgets.Faint(k.Info.Title).Hinted(k.Info.Sentence))
	}
	l.marks = append(l.marks, widgets.NewHatch())
	l.lines = append(l.lines, widgets.Faint("unknown").Hinted("The data do not give it: it counts half its weight, with the whole of it as range."))
	for _, line := range l.lines {
		line.TextSize = 11
	}
	l.Refresh()
	return true
}

// CreateRenderer implements fyne.Widget.
func (l *legend) CreateRenderer() fyne.WidgetRenderer { return &legendRenderer{l} }

type legendRenderer struct{ l *legend }

func (r *legendRenderer) MinSize() fyne.Size { return fyne.NewSize(200, legendLine) }

func (r *legendRenderer) Layout(size fyne.Size) {
	r.l.flow(size.Width, func(i int, x, y, width float32) {
		put(r.l.marks[i], x, y+4, 9, 9)
		put(r.l.lines[i], x+14, y, width, legendLine)
	})
}

func (r *legendRenderer) Refresh() {
	r.Layout(r.l.Size())
	for _, o := range r.Objects() {
		o.Refresh()
	}
}

func (r *legendRenderer) Objects() []fyne.CanvasObject {
	out := slices.Clone(r.l.marks)
	for _, l := range r.l.lines {
		out = append(out, l)
	}
	return out
}
func (r *legendRenderer) Destroy() {}
