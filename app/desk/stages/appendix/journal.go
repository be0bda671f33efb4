package appendix

import (
	"fmt"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
)

// journalPane lists every change, newest first.
type journalPane struct {
	c       *core.Core
	now     func() time.Time
	content fyne.CanvasObject
	list    *widget.List
	filter  *widget.Entry
	head    *widgets.Line
	undo    *widget.Button
	redo    *widget.Button
	undone  *widgets.Line
	redone  *widgets.Line

	said  *speaker
	asked int // number of the newest look; older ones are dropped
	of    *live.View
	found *journalFound
}

// journalFound is what a look at the journal gave.
type journalFound struct {
	lines      []journalLine // all, oldest first
	shown      []int         // of lines, newest first, those that the filter leaves
	takenBack  map[int64]bool
	undo, redo string
}

func newJournalPane(c *core.Core, now func() time.Time) *journalPane {
	p := &journalPane{c: c, now: now, filter: widget.NewEntry(), head: widgets.Faint(""), undone: widgets.Faint(""), redone: widgets.Faint(""), said: newSpeaker(c.Parts.Catalog, c.Parts.Params), found: &journalFound{}}
	p.filter.SetPlaceHolder("Find in the journal: a word, a name, a day")
	p.filter.OnChanged = func(string) { p.ask() }
	p.undo = widget.NewButton("Undo", c.Undo)
	p.redo = widget.NewButton("Redo", c.Redo)
	p.list = widget.NewList(func() int { return len(p.found.shown) }, func() fyne.CanvasObject { return newJournalCell() },
		func(i widget.ListItemID, o fyne.CanvasObject) {
			l := p.found.lines[p.found.shown[i]]
			o.(*journalCell).show(l, p.found.takenBack[l.seq])
		})
	p.list.HideSeparators = true
	p.list.OnSelected = func(widget.ListItemID) { p.list.UnselectAll() }
	steps := container.New(pairs{label: 76}, p.undo, p.undone, p.redo, p.redone)
	p.content = padded(container.NewBorder(container.NewVBox(steps, gap(2), p.filter, p.head), nil, nil, nil, p.list))
	p.changed()
	return p
}

func (p *journalPane) changed() {
	if v := p.c.View(); p.of == nil || len(v.Journal) != len(p.of.Journal) || v.Path != p.of.Path {
		p.ask()
	}
}

// ask looks at the journal in the background; the newest look wins. Entries that were put into words
// before are kept, since an entry never changes.
func (p *journalPane) ask() {
	p.asked++
	number, v, want, now := p.asked, p.c.View(), strings.ToLower(strings.TrimSpace(p.filter.Text)), p.now()
	known := p.found.lines
	if p.of != nil && p.of.Path != v.Path {
		known = nil
	}
	p.of = v
	said := p.said
	go func() {
		f := lookAt(v, said, known, want, now)
		p.c.Do(func() {
			if number == p.asked {
				p.show(f, want)
			}
		})
	}()
}

func lookAt(v *live.View, said *speaker, known []journalLine, want string, now time.Time) *journalFound {
	f := &journalFound{lines: known[:min(len(known), len(v.Journal)):min(len(known), len(v.Journal))]}
	for _, e := range v.Journal[len(f.lines):] {
		f.lines = append(f.lines, said.line(e, now))
	}
	for i := len(f.lines) - 1; i >= 0; i-- {
		if want == "" || strings.Contains(f.lines[i].search, want) {
			f.shown = append(f.shown, i)
		}
	}
	var undo, redo int64
	f.takenBack, undo, redo = standing(v.Journal)
	for i := len(f.lines) - 1; i >= 0 && (undo != 0 || redo != 0); i-- {
		switch f.lines[i].seq {
		case undo:
			f.undo, undo = f.lines[i].what, 0
		case redo:
			f.redo, redo = f.lines[i].what, 0
		}
	}
	return f
}

func (p *journalPane) show(f *journalFound, want string) {
	p.found = f
	text := core.Counted(len(f.lines), "change", "changes")
	if want != "" {
		text = fmt.Sprintf("%s of %s", core.Count(len(f.shown)), text)
	}
	p.head.Set(text + ", the newest first. Nothing that was ever done is lost.")
	say := func(b *widget.Button, l *widgets.Line, what, none, would string) {
		able(b, what != "")
		if what == "" {
			l.Set(none)
		} else {
			l.Set(would + what)
		}
	}
	say(p.undo, p.undone, f.undo, "nothing to take back", "takes back: ")
	say(p.redo, p.redone, f.redo, "nothing to bring back", "brings back: ")
	p.list.Refresh()
}

// journalCell is one row of the journal.
type journalCell struct {
	widget.BaseWidget
	all, top   *fyne.Container
	rule       *canvas.Rectangle
	head, mark *widgets.Line
	what       *widgets.Paragraph
}

func newJournalCell() *journalCell {
	c := &journalCell{rule: canvas.NewRectangle(widgets.Colour(theme.Rule)), head: widgets.Faint(""), mark: widgets.Faint("").Wide(), what: widgets.NewParagraph("", 2)}
	c.rule.SetMinSize(fyne.NewSize(1, 1))
	c.what.TextSize = 13
	c.top = container.NewBorder(nil, nil, nil, c.mark, c.head)
	c.all = container.New(layout.NewCustomPaddedLayout(0, 4, 0, 14), container.NewVBox(c.rule, c.top, c.what))
	c.ExtendBaseWidget(c)
	return c
}

// CreateRenderer implements fyne.Widget.
func (c *journalCell) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(c.all) }

func (c *journalCell) show(l journalLine, takenBack bool) {
	c.rule.FillColor = widgets.Colour(theme.Rule)
	head := fmt.Sprintf("%d · %s", l.seq, l.head)
	if l.reason != "" {
		head += " · " + l.reason
	}
	c.head.Set(head)
	mark, colour := "", toolkit.ColorNameForeground
	if takenBack {
		mark, colour = "taken back", theme.Faint
	}
	if c.mark.Text != mark {
		c.mark.Set(mark)
		c.top.Refresh()
	}
	if c.what.Text != l.what || c.what.Colour != colour {
		c.what.Text, c.what.Colour = l.what, colour
		c.what.Refresh()
	}
}
