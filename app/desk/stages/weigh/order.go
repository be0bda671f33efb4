package weigh

import (
	"fmt"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
)

func categoryOf(key int) string { return draw.Category(key) }

func textWidth(l *widgets.Line) float64 {
	return draw.TextWidth(l.Text, float64(l.TextSize), l.Bold) + 2
}

// order is the part of the stage that lists everything that is ordered.
type order struct {
	s        *stage
	items    []int // shown, in order; nil for all
	open     string
	openAt   int // row of the list that is unfolded, -1 for none
	filter   *widget.Entry
	list     *orderList
	lead     *widget.Label
	count    *widgets.Line
	legend   *legend
	bars     *picture // of the first places, in the place of the list
	scroll   *container.Scroll
	toggle   *widget.Button
	pictured bool // the picture is shown
	columns  *widgets.Line
	all      *fyne.Container
	work     latest
	names    []string // lower case, by item of namesOf
	namesOf  *shown
	wanted   string // what is filtered by
	filtered *shown // the order that items are of
}

func newOrder(s *stage) *order {
	o := &order{s: s, openAt: -1, filter: widget.NewEntry(), lead: widgets.NewText(""), count: widgets.Faint("").Wide(), legend: newLegend()}
	o.filter.SetPlaceHolder("Find a site or a plant option")
	o.filter.OnChanged = func(string) { o.search() }
	o.list = newOrderList(o)
	o.columns = widgets.Faint("score · first in … of 100 weight mixes").Hinted("The score under the voice's weights; in how many of 100 weight mixes near them, with what is uncertain drawn anew in each, the candidate comes first.")
	o.columns.TextSize, o.columns.Align = 11, fyne.TextAlignTrailing
	o.scroll = container.NewVScroll(nil)
	o.bars = newPicture(s.c, o.scroll.Refresh)
	o.bars.pressed = func(id string, add bool) {
		if item, ok := o.filtered.item(id); ok {
			o.choose(item, add)
		}
	}
	o.scroll.Content = container.New(inset{right: 12}, o.bars)
	o.toggle = widget.NewButton("", func() { o.picture(!o.pictured) })
	o.picture(false)
	bar := container.NewBorder(nil, nil, nil, container.NewHBox(o.count, o.toggle), o.filter)
	o.all = container.New(free{
		min: func() fyne.Size { return fyne.NewSize(380, 220) },
		place: func(size fyne.Size) {
			o.lead.Resize(fyne.NewSize(size.Width+12, 20))
			y := o.lead.MinSize().Height - 6
			put(o.lead, -6, -6, size.Width+12, y)
			put(bar, 0, y, size.Width, bar.MinSize().Height)
			y += bar.MinSize().Height + 4
			put(o.scroll, 0, y, size.Width, size.Height-y)
			h := o.legend.flow(size.Width, nil)
			put(o.legend, 0, y, size.Width, h)
			y += h + 4
			// Over the columns of a row.
			right := size.Width - 36
			if size.Width >= wideRow {
				right -= min(size.Width*0.17, 150) + 8
			}
			put(o.columns, 0, y, right, 16)
			before := o.list.Size().Width >= wideRow
			put(o.list, 0, y+18, size.Width, size.Height-y-18)
			if before != (size.Width >= wideRow) && o.filtered != nil {
				o.reopen()
				o.list.Refresh()
			}
		},
	}, o.lead, bar, o.legend, o.columns, o.list, o.scroll)
	return o
}

func (o *order) object() fyne.CanvasObject { return o.all }

func (o *order) changed(core.Change) {
	sh := o.s.shown
	if sh == nil || sh.Err != nil {
		o.items = []int{}
		words := "The order stands here once the study is computed."
		if sh != nil {
			words = "Give at least one consequence a weight above 0; there is no order without one."
		} else if v := o.s.c.View(); v != nil && v.Board != nil {
			words = "No voice weighs anything yet. Give weights first."
		}
		o.say(words)
		o.count.Set("")
		o.list.Refresh()
		return
	}
	o.say(o.leadWords(sh))
	if o.legend.set(sh.Board.Keys) {
		o.all.Refresh()
	}
	o.search()
}

func (o *order) say(words string) {
	if o.lead.Text != words {
		o.lead.SetText(words)
		o.all.Refresh()
	}
}

// leadWords says how the first place is held.
func (o *order) leadWords(sh *shown) string {
	st := &sh.Standing
	first := st.Order[0]
	words := fmt.Sprintf("%s leads with %s (%s to %s)", o.s.c.IDTitle(sh.Board.IDs[first]), scoreWords(st.Score[first]), scoreWords(st.Low[first]), scoreWords(st.High[first]))
	if row := o.s.facts.row(first); row != nil {
		words += ", first in " + share100(row.FirstIn100) + " of 100 weight mixes"
	}
	others := 0
	for _, item := range st.Order[1:] {
		if st.Tier[item] != st.Tier[first] {
			break
		}
		others++
	}
	switch others {
	case 0:
		words += "; it is alone in its tier."
	case 1:
		words += "; 1 other shares its tier and cannot be told apart."
	default:
		words += fmt.Sprintf("; %d others share its tier and cannot be told apart.", others)
	}
	if n := len(sh.Board.Held); n > 0 {
		words += fmt.Sprintf(" Gates hold %s back.", plural(n, "candidate"))
	}
	beside, err := sh.Board.Beside(sh.Raw, st)
	if err != nil {
		return words
	}
	var would []string
	for _, b := range beside {
		if b.Why == "" {
			would = append(would, fmt.Sprintf("%s at place %d", strings.ToLower(b.Title), b.Place))
		}
	}
	if len(would) > 0 {
		words += " Beside the candidates would stand " + strings.Join(would, ", ") + "."
	}
	return words
}

// search finds what the filter lets through, off the window's goroutine, and shows it.
func (o *order) search() {
	sh := o.s.shown
	if sh == nil || sh.Err != nil {
		return
	}
	want := strings.ToLower(strings.TrimSpace(o.filter.Text))
	if want == "" {
		o.wanted, o.items, o.filtered = "", nil, sh
		o.show()
		return
	}
	if want == o.wanted && o.filtered != nil && o.filtered.Ranking == sh.Ranking {
		o.show()
		return
	}
	names := o.names
	if o.namesOf == nil || o.namesOf.Board != sh.Board || o.namesOf.snap != sh.snap {
		names = nil
	}
	plants := plantTitles(o.s.c)
	o.work.ask(o.s.c, want, func() func() {
		if names == nil {
			names = make([]string, len(sh.Board.IDs))
			for i := range names {
				if c := sh.candidate(i); c != nil {
					names[i] = strings.ToLower(c.Site + " " + plants[c.Plant])
				} else {
					names[i] = "doing nothing"
				}
			}
		}
		items := []int{}
		for _, item := range sh.Standing.Order {
			if strings.Contains(names[item], want) {
				items = append(items, item)
			}
		}
		return func() {
			o.names, o.namesOf = names, sh
			if strings.ToLower(strings.TrimSpace(o.filter.Text)) == want {
				o.wanted, o.items, o.filtered = want, items, sh
				o.show()
			}
		}
	})
}

// plantTitles gives the titles of the plant options, for use on other goroutines.
func plantTitles(c *core.Core) map[string]string {
	titles := map[string]string{}
	for _, p := range c.View().Snap.Plants() {
		titles[p] = c.PlantTitle(p)
	}
	return titles
}

// rows gives the items shown, in order.
func (o *order) rows() []int {
	if o.items != nil || o.filtered == nil {
		return o.items
	}
	return o.filtered.Standing.Order
}

func (o *order) show() {
	n := len(o.rows())
	words := fmt.Sprintf("%d in order", n)
	if o.items != nil {
		words = fmt.Sprintf("%d of %d", n, len(o.filtered.Standing.Order))
	}
	if o.count.Text != words {
		o.count.Set(words)
		o.all.Refresh()
	}
	o.reopen()
	o.list.Refresh()
	o.drawBars()
}

// picture changes between the list and the picture of its first places.
func (o *order) picture(yes bool) {
	o.pictured = yes
	words := "As a picture"
	if yes {
		words = "As a list"
	}
	o.toggle.SetText(words)
	show(o.scroll, yes)
	for _, l := range []fyne.CanvasObject{o.legend, o.columns, o.list} {
		show(l, !yes)
	}
	o.drawBars()
}

// reopen keeps the unfolded candidate unfolded wherever it stands now.
func (o *order) reopen() {
	at := -1
	if o.open != "" {
		at = slices.IndexFunc(o.rows(), func(item int) bool { return o.filtered.Board.IDs[item] == o.open })
	}
	if o.openAt >= 0 && o.openAt != at {
		o.list.SetItemHeight(o.openAt, rowHeight)
	}
	if o.openAt = at; at >= 0 {
		o.list.SetItemHeight(at, unfoldedHeight(len(o.filtered.Board.Keys), o.list.Size().Width))
	}
}

// choose implements rowAbout.
func (o *order) choose(item int, add bool) {
	id := o.filtered.Board.IDs[item]
	o.list.at = slices.Index(o.rows(), item)
	o.s.c.Window.Canvas().Focus(o.list)
	switch {
	case o.filtered.candidate(item) == nil:
		o.s.c.Tell("Doing nothing is no candidate: there is nothing to show beside its place.")
	case add:
		o.s.c.Toggle(id)
	default:
		o.s.c.Choose(id)
	}
}

// unfold implements rowAbout.
func (o *order) unfold(item int) {
	id := o.filtered.Board.IDs[item]
	if o.open == id {
		id = ""
	}
	o.open = id
	o.reopen()
	o.list.Refresh()
}

// orderList is the list of the order, with its keyboard.
type orderList struct {
	widget.List
	o       *order
	at      int // row under the keyboard
	focused bool
}

func newOrderList(o *order) *orderList {
	l := &orderList{o: o}
	l.HideSeparators = true
	l.Length = func() int { return len(o.rows()) }
	l.CreateItem = func() fyne.CanvasObject { return newOrderRow(o.s, o) }
	l.UpdateItem = func(id int, obj fyne.CanvasObject) {
		if rows := o.rows(); id < len(rows) {
			obj.(*orderRow).update(o.filtered, rows[id], l.focused && id == l.at, id == o.openAt)
		}
	}
	l.ExtendBaseWidget(l)
	return l
}

// FocusGained implements fyne.Focusable.
func (l *orderList) FocusGained() { l.focused = true; l.Refresh() }

// FocusLost implements fyne.Focusable.
func (l *orderList) FocusLost() { l.focused = false; l.Refresh() }

// TypedKey implements fyne.Focusable: arrows move, return or space choose, right and left unfold and fold,
// + adds to the chosen ones.
func (l *orderList) TypedKey(e *fyne.KeyEvent) {
	rows := l.o.rows()
	if len(rows) == 0 {
		return
	}
	at := min(l.at, len(rows)-1)
	page := max(int(l.Size().Height/(rowHeight+4))-1, 1)
	switch e.Name {
	case fyne.KeyUp:
		at--
	case fyne.KeyDown:
		at++
	case fyne.KeyPageUp:
		at -= page
	case fyne.KeyPageDown:
		at += page
	case fyne.KeyHome:
		at = 0
	case fyne.KeyEnd:
		at = len(rows) - 1
	case fyne.KeyReturn, fyne.KeyEnter, fyne.KeySpace:
		l.o.choose(rows[at], false)
		return
	case fyne.KeyRight, fyne.KeyLeft:
		if (l.o.openAt == at) == (e.Name == fyne.KeyLeft) {
			l.o.unfold(rows[at])
		}
		return
	default:
		return
	}
	l.at = min(max(at, 0), len(rows)-1)
	l.ScrollTo(l.at)
}

// TypedRune implements fyne.Focusable.
func (l *orderList) TypedRune(r rune) {
	if rows := l.o.rows(); r == '+' && l.at < len(rows) {
		l.o.choose(rows[l.at], true)
	}
}
