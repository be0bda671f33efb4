package weigh

import (
	"fmt"
	"image/color"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/driver/desktop"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
)

const (
	rowHeight  = 44
	partHeight = 19
	narrowPart = 35
	wideRow    = 640 // from this width the columns of a row stand side by side
)

// unfoldedHeight is the height of a row that shows its parts. In a narrow one the accounts stand in a line
// of their own, and so does every value.
func unfoldedHeight(keys int, width float32) float32 {
	if width >= wideRow {
		return rowHeight + 4 + 18 + partHeight*float32(keys) + 8
	}
	return rowHeight + 17 + 18 + narrowPart*float32(keys) + 6
}

// rowAbout is what a row does when it is used.
type rowAbout interface {
	choose(item int, add bool)
	unfold(item int)
}

// orderRow is one line of the order.
type orderRow struct {
	widget.BaseWidget
	s     *stage
	about rowAbout

	item     int
	focused  bool
	chosen   bool
	newTier  bool
	unfolded bool
	looks    int // see stage
	modifier fyne.KeyModifier

	place, tier, title, plant, score, firstIn, flags, accounts *widgets.Line

	badge *badge
	bar   *scoreBar
	first *shareBar
	fold  *foldMark
	heads [5]*widgets.Line
	parts []*partLine
	buf   []barPart
}

func newOrderRow(s *stage, about rowAbout) *orderRow {
	r := &orderRow{s: s, about: about, place: widgets.NewLine(""), tier: widgets.Faint(""), title: widgets.NewLine(""), plant: widgets.Faint(""), score: widgets.NewLine(""),
		firstIn: widgets.Faint(""), flags: widgets.Faint(""), accounts: widgets.Faint(""), badge: newBadge(), bar: newScoreBar(), first: newShareBar()}
	r.tier.TextSize = 11
	r.place.Bold, r.title.Bold, r.score.Bold = true, true, true
	for _, l := range []*widgets.Line{r.score, r.firstIn, r.flags} {
		l.Align = fyne.TextAlignTrailing
	}
	for i, head := range []string{"consequence", "value", "0 to 1", "weight", "adds"} {
		r.heads[i] = widgets.Faint(head)
		r.heads[i].TextSize = 11
		if i > 0 {
			r.heads[i].Align = fyne.TextAlignTrailing
		}
	}
	r.heads[2].Hint = "Where the value lies on its scale: 0 is the worst end, 1 the best."
	r.heads[3].Hint = "Share of all weight of the voice."
	r.heads[4].Hint = "What it adds to the score: weight times value; half its weight when the value is unknown."
	r.fold = newFoldMark(func() { r.about.unfold(r.item) })
	r.ExtendBaseWidget(r)
	return r
}

// update shows an item of an order.
func (r *orderRow) update(sh *shown, item int, focused, unfolded bool) {
	st, c := &sh.Standing, r.s.c
	r.item = item
	id := sh.Board.IDs[item]
	letter := r.s.chosenLetter(id)
	place := st.Place[item]
	newTier := place == 1 || st.Tier[st.Order[place-2]] != st.Tier[item]
	changed := r.focused != focused || r.unfolded != unfolded || r.chosen != (letter != "") || r.newTier != newTier || r.looks != r.s.looks
	r.looks = r.s.looks
	r.focused, r.unfolded, r.chosen, r.newTier = focused, unfolded, letter != "", newTier
	r.place.Set(strconv.Itoa(place))
	r.tier.Set("tier " + strconv.Itoa(st.Tier[item]))
	r.tier.Hint = "Those of one tier cannot be told apart from its first: their low to high reach into each other."
	r.badge.set(letter)
	cand := sh.candidate(item)
	if cand == nil {
		r.title.Set("Doing nothing")
		r.title.Hint = "No plant at all: every burden is spared, nothing is gained."
		r.plant.Set("no plant")
	} else {
		r.title.Set(cand.Site)
		r.title.Hint = ""
		r.plant.Set(c.PlantTitle(cand.Plant))
	}
	r.score.Set(scoreWords(st.Score[item]))
	r.score.Hint = fmt.Sprintf("Score %.4f, from %s to %s with what is uncertain or unknown.", st.Score[item], scoreWords(st.Low[item]), scoreWords(st.High[item]))
	r.buf = partsOf(sh, item, r.buf[:0])
	r.bar.set(r.buf, st.Low[item], st.High[item])
	r.bar.words = func() string { return partWords(r.s, sh, item) }
	row := r.s.facts.row(item)
	if row != nil {
		r.firstIn.Set(share100(row.FirstIn100))
		r.firstIn.Hint = fmt.Sprintf("First in %s of 100 weight mixes near the voice's weights, with what is uncertain drawn anew in each.", share100(row.FirstIn100))
		r.first.set(row.FirstIn100 / 100)
	} else {
		r.firstIn.Set("…")
		r.firstIn.Hint = "In how many of 100 weight mixes it comes first is computed after the weights were saved."
		r.first.set(0)
	}
	words, hint, warm := r.flagWords(sh, item, cand, row)
	colour := theme.Faint
	if warm {
		colour = theme.Warm
	}
	r.flags.SetLook(words, colour, false)
	r.flags.Hint = hint
	r.accounts.Set(r.accountWords(sh))
	r.fold.set(unfolded)
	if unfolded {
		r.updateParts(sh, cand)
	}
	if changed {
		r.Refresh()
	}
}

// flagWords says what is to be known of a candidate beside its score.
func (r *orderRow) flagWords(sh *shown, item int, cand *run.Candidate, row *run.Row) (words, hint string, warm bool) {
	var flags, hints []string
	if cand != nil && len(cand.OverLimit) > 0 {
		titles := make([]string, len(cand.OverLimit))
		for i, key := range cand.OverLimit {
			titles[i] = r.s.c.Info(key).Title
		}
		flags = append(flags, "over: "+strings.Join(titles, ", "))
		hints = append(hints, "Over the limit that was set for: "+strings.Join(titles, ", ")+". No score makes up for that.")
		warm = true
	}
	var unknown []string
	for k, key := range sh.Board.Keys {
		if sh.Standing.Weights[k] > 0 && !sh.Board.Part(item, k).Known {
			unknown = append(unknown, key.Info.Title)
		}
	}
	if len(unknown) > 0 {
		flags = append(flags, fmt.Sprintf("%d unknown", len(unknown)))
		hints = append(hints, "Unknown: "+strings.Join(unknown, ", ")+". Each counts half its weight, with the whole of it as range.")
	}
	if cand != nil && len(cand.Incomplete) > 0 {
		rules := make([]string, len(cand.Incomplete))
		for i, rule := range cand.Incomplete {
			rules[i] = present.Rule(rule)
		}
		flags = append(flags, "incomplete")
		hints = append(hints, "Computed without rules that are not set: "+strings.Join(rules, ", ")+".")
	}
	if row != nil && len(row.DominatedBy) > 0 {
		flags = append(flags, "dominated")
		hints = append(hints, r.s.c.IDTitle(row.DominatedBy[0])+" is at least as good in everything that is weighed, better in something.")
	}
	if row != nil && row.CanBeFirst == "no" {
		flags = append(flags, "cannot be first")
		hints = append(hints, "No weights within the spread of the mixes put it first.")
	}
	return strings.Join(flags, " · "), strings.Join(hints, " "), warm
}

// accountWords gives the sums of the parts by account.
func (r *orderRow) accountWords(sh *shown) string {
	var names []string
	sums := map[string]float64{}
	for k, key := range sh.Board.Keys {
		a := string(key.Info.Account)
		if _, there := sums[a]; !there {
			names = append(names, a)
		}
		if k < len(r.buf) {
			sums[a] += r.buf[k].share
		}
	}
	for i, n := range names {
		names[i] = n + " " + scoreWords(sums[n])
	}
	return strings.Join(names, " · ")
}

// partLine is one consequence of an unfolded row.
type partLine struct {
	swatch *canvas.Rectangle
	hatch  *widgets.Hatch
	cells  [5]*widgets.Line
}

func (r *orderRow) updateParts(sh *shown, cand *run.Candidate) {
	for len(r.parts) < len(sh.Board.Keys) {
		p := &partLine{swatch: canvas.NewRectangle(theme.Colour(categoryOf(len(r.parts)))), hatch: widgets.NewHatch()}
		for i := range p.cells {
			p.cells[i] = widgets.NewLine("")
			p.cells[i].TextSize = 12
			if i > 0 {
				p.cells[i].Align = fyne.TextAlignTrailing
			}
		}
		r.parts = append(r.parts, p)
	}
	r.parts = r.parts[:len(sh.Board.Keys)]
	for k, key := range sh.Board.Keys {
		p := r.parts[k]
		part := sh.Board.Part(r.item, k)
		p.cells[0].Set(key.Info.Title)
		p.cells[0].Hint = key.Info.Title + ": " + key.Info.Sentence
		value, colour, hint := "", fyne.ThemeColorName(toolkit.ColorNameForeground), ""
		if cand != nil {
			q, _ := cand.Consequence(key.Info.Key)
			value, hint = present.Value(q), present.WhyNot(q)
			if part.OverLimit {
				value, colour = value+", over the limit", theme.Warm
			}
		} else {
			value = "as it is now"
		}
		p.cells[1].SetLook(value, colour, false)
		p.cells[1].Hint = hint
		unit := "unknown"
		if part.Known {
			unit = scoreWords(part.Mid)
		}
		p.cells[2].Set(unit)
		p.cells[3].Set(percentWords(sh.Standing.Weights[k]))
		_, mid, _ := sh.Board.Share(&sh.Standing, r.item, k)
		p.cells[4].Set(scoreWords(mid))
		show(p.hatch, !part.Known)
		if part.Known {
			p.swatch.Show()
		} else {
			p.swatch.Hide()
		}
	}
}

// MouseDown implements desktop.Mouseable.
func (r *orderRow) MouseDown(e *desktop.MouseEvent) { r.modifier = e.Modifier }

// MouseUp implements desktop.Mouseable.
func (r *orderRow) MouseUp(*desktop.MouseEvent) {}

// Tapped implements fyne.Tappable.
func (r *orderRow) Tapped(*fyne.PointEvent) {
	r.about.choose(r.item, adding(r.modifier))
	r.modifier = 0
}

// CreateRenderer implements fyne.Widget.
func (r *orderRow) CreateRenderer() fyne.WidgetRenderer {
	rr := &orderRowRenderer{r: r, tint: canvas.NewRectangle(color.Transparent), tier: newRule(), focus: canvas.NewRectangle(color.Transparent)}
	rr.Refresh()
	return rr
}

type orderRowRenderer struct {
	r           *orderRow
	tint, focus *canvas.Rectangle
	tier        *rule
	objects     []fyne.CanvasObject
}

func (rr *orderRowRenderer) MinSize() fyne.Size { return fyne.NewSize(380, rowHeight) }

func (rr *orderRowRenderer) Layout(size fyne.Size) {
	r := rr.r
	w := size.Width
	put(rr.tint, 0, 0, w, size.Height)
	put(rr.focus, 2, 1, w-4, size.Height-2)
	put(rr.tier, 0, -2, w, 1)
	put(r.place, 6, 3, 44, 19)
	put(r.tier, 6, 22, 44, 16)
	put(r.badge, 50, 4, 17, 17)
	put(r.fold, w-28, 4, 22, 22)
	x := float32(72)
	if w >= wideRow {
		title := min(w*0.2, 190)
		put(r.title, x, 3, title, 19)
		put(r.plant, x, 22, title, 17)
		bar := x + title + 12
		flags := min(w*0.17, 150)
		right := w - 36 - flags
		put(r.flags, right, 3, flags, 19)
		put(r.first, right-92, 11, 56, 5)
		put(r.firstIn, right-34, 3, 26, 19)
		put(r.score, right-92-52, 3, 42, 19)
		put(r.bar, bar, 5, right-92-56-bar, 16)
		put(r.accounts, bar, 23, w-36-bar, 17)
	} else {
		right := w - 36
		put(r.firstIn, right-26, 3, 26, 19)
		put(r.first, right-26-48, 11, 44, 5)
		put(r.score, right-26-48-48, 3, 42, 19)
		room := right - 26 - 48 - 48 - x - 6
		name := min(float32(textWidth(r.title)), room)
		put(r.title, x, 3, name, 19)
		put(r.plant, x+name+6, 4, room-name-6, 18)
		bar := w * 0.42
		put(r.bar, x, 25, bar, 14)
		put(r.flags, x+bar+10, 22, w-8-x-bar-10, 18)
		put(r.accounts, x, rowHeight-2, w-x-8, 17)
	}
	if !r.unfolded {
		return
	}
	wide := w >= wideRow
	y, at, height := float32(rowHeight)+4, x, float32(partHeight)
	if !wide {
		y, at, height = rowHeight+17, 8, narrowPart
	}
	end, value := w-8, w*0.3
	columns := [5][2]float32{{at + 14, 0}, {end - 142 - value, value}, {end - 134, 52}, {end - 78, 38}, {end - 36, 36}}
	if wide {
		columns[0][1] = columns[1][0] - columns[0][0] - 6
	} else {
		columns[0][1] = columns[2][0] - columns[0][0] - 6
		columns[1] = [2]float32{at + 14, end - at - 14}
	}
	for i, h := range r.heads {
		put(h, columns[i][0], y, columns[i][1], 16)
	}
	y += 18
	for _, p := range r.parts {
		put(p.swatch, at, y+5, 9, 9)
		put(p.hatch, at, y+5, 9, 9)
		for i, c := range p.cells {
			down := float32(0)
			if i == 1 {
				c.Align = fyne.TextAlignTrailing
				if !wide {
					c.Align, down = fyne.TextAlignLeading, 15
				}
			}
			put(c, columns[i][0], y+down, columns[i][1], partHeight)
		}
		y += height
	}
}

func (rr *orderRowRenderer) Refresh() {
	r := rr.r
	rr.tint.FillColor = color.Transparent
	rr.tint.CornerRadius, rr.focus.CornerRadius = 4, 4
	if r.chosen {
		rr.tint.FillColor = widgets.Colour(theme.Tint)
	}
	rr.focus.FillColor, rr.focus.StrokeWidth, rr.focus.StrokeColor = color.Transparent, 0, color.Transparent
	if r.focused {
		rr.focus.StrokeWidth, rr.focus.StrokeColor = 2, widgets.Colour(toolkit.ColorNamePrimary)
	}
	wide := r.Size().Width >= wideRow
	rr.objects = append(rr.objects[:0], rr.tint, rr.focus, r.place, r.tier, r.badge, r.title, r.plant, r.score, r.firstIn, r.first, r.flags, r.bar, r.fold)
	if r.newTier {
		rr.objects = append(rr.objects, rr.tier)
	}
	if wide || r.unfolded {
		rr.objects = append(rr.objects, r.accounts)
	}
	if r.unfolded {
		for i, h := range r.heads {
			if i != 1 || wide {
				rr.objects = append(rr.objects, h)
			}
		}
		for _, p := range r.parts {
			rr.objects = append(rr.objects, p.swatch, p.hatch)
			for _, c := range p.cells {
				rr.objects = append(rr.objects, c)
			}
		}
	}
	rr.Layout(r.Size())
	for _, o := range rr.objects {
		o.Refresh()
	}
}

func (rr *orderRowRenderer) Objects() []fyne.CanvasObject { return rr.objects }
func (rr *orderRowRenderer) Destroy()                     {}

// foldMark opens and closes a row.
type foldMark struct {
	widget.BaseWidget
	open, hovered bool
	tapped        func()
}

func newFoldMark(tapped func()) *foldMark {
	f := &foldMark{tapped: tapped}
	f.ExtendBaseWidget(f)
	return f
}

func (f *foldMark) set(open bool) {
	if f.open != open {
		f.open = open
		f.Refresh()
	}
}

// Tapped implements fyne.Tappable.
func (f *foldMark) Tapped(*fyne.PointEvent) { f.tapped() }

// MouseIn implements desktop.Hoverable.
func (f *foldMark) MouseIn(e *desktop.MouseEvent) {
	f.hovered = true
	f.Refresh()
	if widgets.Explainer != nil {
		widgets.Explainer(f, "Show what the score is made of (right arrow), or hide it (left arrow).", e.AbsolutePosition)
	}
}

// MouseMoved implements desktop.Hoverable.
func (f *foldMark) MouseMoved(*desktop.MouseEvent) {}

// MouseOut implements desktop.Hoverable.
func (f *foldMark) MouseOut() {
	f.hovered = false
	f.Refresh()
	if widgets.Explainer != nil {
		widgets.Explainer(f, "", fyne.Position{})
	}
}

// CreateRenderer implements fyne.Widget.
func (f *foldMark) CreateRenderer() fyne.WidgetRenderer {
	r := &foldRenderer{f: f, ground: canvas.NewCircle(color.Transparent), across: canvas.NewRectangle(color.Transparent), down: canvas.NewRectangle(color.Transparent)}
	r.Refresh()
	return r
}

type foldRenderer struct {
	f            *foldMark
	ground       *canvas.Circle
	across, down *canvas.Rectangle
}

func (r *foldRenderer) MinSize() fyne.Size { return fyne.NewSize(22, 22) }

func (r *foldRenderer) Layout(size fyne.Size) {
	put(r.ground, 2, 2, size.Width-4, size.Height-4)
	put(r.across, size.Width/2-4, size.Height/2-0.75, 8, 1.5)
	put(r.down, size.Width/2-0.75, size.Height/2-4, 1.5, 8)
}

func (r *foldRenderer) Refresh() {
	ink := widgets.Colour(toolkit.ColorNameForeground)
	r.ground.FillColor = widgets.Colour(theme.Track)
	r.ground.StrokeWidth, r.ground.StrokeColor = 0, color.Transparent
	if r.f.hovered {
		r.ground.StrokeWidth, r.ground.StrokeColor = 1, widgets.Colour(theme.Faint)
	}
	r.across.FillColor, r.down.FillColor = ink, ink
	if r.f.open {
		r.down.Hide()
	} else {
		r.down.Show()
	}
	r.ground.Refresh()
	r.across.Refresh()
	r.down.Refresh()
}

func (r *foldRenderer) Objects() []fyne.CanvasObject {
	return []fyne.CanvasObject{r.ground, r.across, r.down}
}
func (r *foldRenderer) Destroy() {}
