package weigh

import (
	"image/color"
	"strconv"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
)

const shortHeight = 22

// shortRow is one line of the short order under the weights.
type shortRow struct {
	widget.BaseWidget
	s     *stage
	id    string
	has   bool // there is something to show
	fits  bool // there is room for it
	place *widgets.Line
	badge *badge
	title *widgets.Line
	bar   *scoreBar
	score *widgets.Line
	parts []barPart
	all   *fyne.Container
}

func newShortRow(s *stage) *shortRow {
	r := &shortRow{s: s, place: widgets.NewLine(""), badge: newBadge(), title: widgets.NewLine(""), bar: newScoreBar(), score: widgets.NewLine("")}
	r.place.Bold, r.score.Bold = true, true
	r.score.Align = fyne.TextAlignTrailing
	r.all = container.New(free{
		min: func() fyne.Size { return fyne.NewSize(300, shortHeight) },
		place: func(size fyne.Size) {
			title := size.Width * 0.38
			put(r.place, 0, 1, 22, 19)
			put(r.badge, 24, 2, 17, 17)
			put(r.title, 48, 1, title, 19)
			put(r.bar, 48+title+10, 4, size.Width-48-title-10-48, 16)
			put(r.score, size.Width-42, 1, 40, 19)
		},
	}, r.place, r.badge, r.title, r.bar, r.score)
	r.ExtendBaseWidget(r)
	return r
}

func (r *shortRow) update(sh *shown, item int) {
	st := &sh.Standing
	r.id, r.has = sh.Board.IDs[item], true
	r.place.Set(strconv.Itoa(st.Place[item]))
	r.badge.set(r.s.chosenLetter(r.id))
	colour := fyne.ThemeColorName("foreground")
	title := r.s.c.IDTitle(r.id)
	if c := sh.candidate(item); c != nil && len(c.OverLimit) > 0 {
		title += ", over a limit"
		colour = theme.Warm
	}
	r.title.SetLook(title, colour, false)
	r.parts = partsOf(sh, item, r.parts[:0])
	r.bar.set(r.parts, st.Low[item], st.High[item])
	r.bar.words = func() string { return partWords(r.s, sh, item) }
	r.score.Set(scoreWords(st.Score[item]))
	show(r, r.fits)
}

func (r *shortRow) clear() {
	r.has, r.id = false, ""
	show(r, false)
}

// Tapped implements fyne.Tappable.
func (r *shortRow) Tapped(*fyne.PointEvent) {
	if _, ok := r.s.shown.Index.ByID[r.id]; ok {
		r.s.c.Choose(r.id)
	}
}

// CreateRenderer implements fyne.Widget.
func (r *shortRow) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(r.all) }

func newRule() *rule {
	r := &rule{}
	r.ExtendBaseWidget(r)
	return r
}

// rule is a thin line.
type rule struct{ widget.BaseWidget }

// CreateRenderer implements fyne.Widget.
func (r *rule) CreateRenderer() fyne.WidgetRenderer {
	rr := &ruleRenderer{r: canvas.NewRectangle(color.Transparent)}
	rr.Refresh()
	return rr
}

type ruleRenderer struct{ r *canvas.Rectangle }

func (r *ruleRenderer) Layout(size fyne.Size) { r.r.Resize(size) }
func (r *ruleRenderer) MinSize() fyne.Size    { return fyne.NewSize(1, 1) }
func (r *ruleRenderer) Refresh() {
	r.r.FillColor = widgets.Colour(theme.Rule)
	r.r.Refresh()
}
func (r *ruleRenderer) Objects() []fyne.CanvasObject { return []fyne.CanvasObject{r.r} }
func (r *ruleRenderer) Destroy()                     {}
