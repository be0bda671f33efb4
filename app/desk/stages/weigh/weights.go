package weigh

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
)

const swingSentence = "Swing points: give 100 to the change from worst to best that matters most, then the others in proportion to it. Arrow keys move a slider, return saves, escape goes back."

// weights is the part of the stage where weights are given.
type weights struct {
	s       *stage
	rows    []*weightRow
	unready []*unreadyRow
	keys    []string // that rows and unready stand for
	list    *fyne.Container
	cautions,
	problem *widget.Label
	reason *fyne.Container // where one event is weighed twice
	twice  *run.FamilyError
	order  []*shortRow
	lead   *widgets.Line
	all    *fyne.Container
}

func newWeights(s *stage) *weights {
	w := &weights{s: s, list: container.New(layout.NewCustomPaddedVBoxLayout(0)), cautions: widgets.NewText(""), problem: widgets.NewText("")}
	question := widgets.Faint("How much would you give to move each from worst to best?").Hinted(swingSentence)
	add := widget.NewButton("Weigh another consequence…", func() { askKey(s) })
	w.cautions.Importance, w.problem.Importance = widget.WarningImportance, widget.WarningImportance
	w.cautions.Hide()
	w.problem.Hide()
	w.reason = container.NewHBox(widget.NewButton("Say why both count…", func() { askReason(s, w.twice) }))
	w.reason.Hide()
	top := container.NewVBox(question, w.problem, w.reason)
	limits := widgets.NewText("Weights put in order what was computed. They stand in for no study by the network operator, who alone can offer a connection, and for no qualified assessment of noise, ice throw or structure under local law.")
	limits.SizeName = toolkit.SizeNameCaptionText
	foot := container.NewVBox(w.cautions, container.NewHBox(add), flush(limits))
	scroll := container.NewVScroll(container.New(inset{top: 5, right: 12}, container.NewVBox(w.list, foot)))
	w.lead = widgets.Faint("")
	title := widgets.Part("Order").Wide()
	rule := newRule()
	rows := make([]fyne.CanvasObject, 6)
	for i := range rows {
		r := newShortRow(s)
		w.order = append(w.order, r)
		rows[i] = r
	}
	short := container.New(free{
		min: func() fyne.Size { return fyne.NewSize(300, 30) },
		place: func(size fyne.Size) {
			put(rule, 0, 0, size.Width, 1)
			put(title, 0, 5, title.MinSize().Width, 20)
			put(w.lead, title.MinSize().Width+10, 6, size.Width-title.MinSize().Width-10, 20)
			for i, r := range w.order {
				put(r, 0, 28+float32(i)*shortHeight, size.Width, shortHeight)
				r.fits = 28+float32(i+1)*shortHeight <= size.Height+1
				show(r, r.has && r.fits)
			}
		},
	}, append([]fyne.CanvasObject{rule, title, w.lead}, rows...)...)
	w.all = container.New(free{
		min: func() fyne.Size { return fyne.NewSize(380, 220) },
		place: func(size fyne.Size) {
			// As many rows of the order as the height bears and leaves most to the weights.
			n := min(6, max(3, int((0.37*size.Height-30)/shortHeight)))
			foot := 30 + float32(n)*shortHeight
			h := top.MinSize().Height
			put(top, 0, 0, size.Width, h)
			put(scroll, 0, h+2, size.Width, size.Height-h-2-foot-4)
			put(short, 0, size.Height-foot, size.Width, foot)
		},
	}, top, scroll, short)
	return w
}

func (w *weights) object() fyne.CanvasObject { return w.all }

func (w *weights) changed(core.Change) {
	v := w.s.c.View()
	if v == nil || v.Board == nil {
		w.say("The order stands here once the study is computed.")
		return
	}
	var unready []string
	for _, k := range w.s.c.Parts.Params.Keys() {
		if _, no := v.Board.Unready[k.Key]; no {
			unready = append(unready, k.Key)
		}
	}
	keys := make([]string, 0, len(v.Board.Keys)+len(unready))
	for _, k := range v.Board.Keys {
		keys = append(keys, k.Info.Key)
	}
	keys = append(append(keys, ""), unready...)
	if !slices.Equal(keys, w.keys) {
		w.keys = keys
		w.rows, w.unready, w.list.Objects = nil, nil, nil
		for _, k := range v.Board.Keys {
			r := newWeightRow(w.s, k.Info.Key)
			w.rows, w.list.Objects = append(w.rows, r), append(w.list.Objects, r.box)
		}
		for _, key := range unready {
			r := newUnreadyRow(w.s, key)
			w.unready, w.list.Objects = append(w.unready, r), append(w.list.Objects, r.box)
		}
		w.list.Refresh()
	}
	raw, sum := w.s.c.Raw(), total(w.s.c.Raw())
	tipping := map[string]run.TippingRow{}
	leader := "" // its site
	if o := w.s.c.Order(); o != nil && len(o.Order) > 0 {
		leader = o.Order[0].Site
		for _, t := range o.Tipping {
			tipping[t.Key] = t
		}
	}
	for i, r := range w.rows {
		t, ok := tipping[v.Board.Keys[i].Info.Key]
		r.update(v.Board.Keys[i], raw[i], sum, leader, t, ok)
	}
	for _, r := range w.unready {
		r.reason.Set(unreadyWords(v.Board.Unready[r.key]))
	}
	w.updateCautions()
	w.updateOrder()
}

// updateCautions shows what is wrong with the voice's choice of consequences: one event counted twice.
func (w *weights) updateCautions() {
	var words []string
	if o := w.s.c.Order(); o != nil {
		for _, n := range o.Notices {
			words = append(words, present.Notice(n))
		}
	} else if w.s.c.Trying() {
		return // as before
	}
	if text := strings.Join(words, "\n"); text != w.cautions.Text {
		w.cautions.SetText(text)
		show(w.cautions, len(words) > 0)
		w.all.Refresh()
	}
}

func (w *weights) updateOrder() {
	sh := w.s.shown
	w.twice = nil
	if v := w.s.c.View(); v != nil && v.Results != nil && !w.s.c.Trying() {
		errors.As(v.Results.Unready[w.s.c.Voice()], &w.twice)
	}
	if twice := w.twice != nil; twice != w.reason.Visible() {
		show(w.reason, twice)
		w.all.Refresh()
	}
	switch {
	case w.s.c.Voice() == "":
		w.say("There is no voice yet. Add one above, then choose what it weighs.")
	case len(w.rows) == 0 && len(w.unready) == 0:
		w.say("No voice weighs anything yet. Begin with one consequence, then add others.")
	case sh != nil && sh.Err != nil:
		w.say("Give at least one consequence a weight above 0; there is no order without one.")
	case w.twice != nil:
		w.say(fmt.Sprintf("%s and %s count the same event (%s). The voice has no saved order until a reason is given or one of them loses its weight.", w.s.c.Info(w.twice.Other).Title, w.s.c.Info(w.twice.Key).Title, w.twice.Family))
	default:
		w.say("")
	}
	if sh == nil || sh.Err != nil {
		w.lead.Set("")
		for _, r := range w.order {
			r.clear()
		}
		return
	}
	lead := "score and what it is made of"
	if w.s.c.Trying() {
		lead = "as tried out; tipping weights are found after saving"
	}
	w.lead.Set(lead)
	for i, r := range w.order {
		if i < len(sh.Standing.Order) {
			r.update(sh, sh.Standing.Order[i])
		} else {
			r.clear()
		}
	}
}

func (w *weights) say(words string) {
	if w.problem.Text != words {
		w.problem.SetText(words)
		show(w.problem, words != "")
		w.all.Refresh()
	}
}

const weightHeight = 44

// weightRow is one consequence with its weight.
type weightRow struct {
	s      *stage
	key    string
	title  *widgets.Line
	span   *widgets.Line
	slider *slider
	points *pointEntry
	share  *widgets.Line
	tip    *widgets.Line
	ends   *widget.Button
	box    *fyne.Container
}

func newWeightRow(s *stage, key string) *weightRow {
	r := &weightRow{s: s, key: key, span: widgets.Faint(""), share: widgets.NewLine(""), tip: widgets.Warm("")}
	r.title = widgets.NewLine("")
	r.title.Bold = true
	r.share.Align = fyne.TextAlignTrailing
	r.share.Hint = "Share of all weight of the voice."
	r.slider = newSlider(func(p float64) { s.tryOne(key, p) }, s.save, s.back)
	r.points = newPointEntry(func(p float64) {
		s.tryOne(key, p)
		s.save()
	}, func(err error) { s.c.Tell(err.Error()) })
	r.ends = widget.NewButton("…", func() { askScale(s, key) })
	r.ends.Importance = widget.LowImportance
	r.box = container.New(free{
		min: func() fyne.Size { return fyne.NewSize(380, weightHeight) },
		place: func(size fyne.Size) {
			left := min(max(size.Width*0.38, 140), 260)
			ends, text := float32(28), "…"
			if size.Width >= 470 {
				ends, text = 58, "Ends…"
			}
			if r.ends.Text != text {
				r.ends.SetText(text)
			}
			right := 52 + 44 + ends
			put(r.title, 0, 2, left-10, 19)
			put(r.span, 0, 21, left-10, 17)
			put(r.slider, left, -3, size.Width-left-right-6, 28)
			put(r.points, size.Width-right, 0, 50, 26)
			put(r.share, size.Width-ends-44, 4, 42, 19)
			put(r.ends, size.Width-ends+2, 0, ends-2, 26)
			put(r.tip, left+6, 26, size.Width-left-6, 17)
		},
	}, r.title, r.span, r.slider, r.points, r.share, r.ends, r.tip)
	return r
}

func (r *weightRow) update(k run.BoardKey, points, sum float64, leader string, t run.TippingRow, hasTip bool) {
	r.title.Set(k.Info.Title)
	r.title.Hint = k.Info.Title + ": " + k.Info.Sentence
	r.span.Set(scaleWords(k))
	r.span.Hint = fmt.Sprintf("The value scale: worst is %s, best is %s; %s. Beyond the ends nothing is gained or lost.", amount(k.Worst, k.Info.Unit), amount(k.Best, k.Info.Unit), betterWords(k.Better))
	share := "–"
	if sum > 0 {
		share = percentWords(points / sum)
	}
	r.share.Set(share)
	r.points.set(points)
	var marks []float64
	var words, hints []string
	warm := false
	if hasTip {
		for _, side := range []struct {
			at   *run.TippingSide
			word string
		}{{t.Below, "below"}, {t.Above, "above"}} {
			if side.at == nil {
				continue
			}
			title := r.s.c.IDTitle(side.at.NewFirst)
			at, ok := pointsAt(side.at.At, sum-points)
			if !ok {
				words, hints = append(words, "with all the weight: "+title), append(hints, fmt.Sprintf("Only with all the weight on this consequence would %s lead.", title))
				continue
			}
			short, _, _ := strings.Cut(title, ", ")
			if short == leader {
				short = title // another plant on the site that leads
			}
			words = append(words, fmt.Sprintf("%s %s: %s leads", side.word, pointWords(at), short))
			hints = append(hints, fmt.Sprintf("Tipping weight: %s %s points, with the points of the others as they are, %s takes the first place.", side.word, pointWords(at), title))
			if at <= mostPoints {
				marks, warm = append(marks, at), true
			}
		}
	}
	colour := theme.Faint
	if warm {
		colour = theme.Warm
	}
	r.tip.SetLook(strings.Join(words, " · "), colour, false)
	r.tip.Hint = strings.Join(hints, " ")
	r.slider.set(points, marks)
}

// pointEntry takes swing points typed exactly.
type pointEntry struct {
	widget.Entry
	points  float64
	settled func(points float64)
	refused func(error)
	focused bool
}

func newPointEntry(settled func(float64), refused func(error)) *pointEntry {
	e := &pointEntry{settled: settled, refused: refused}
	e.ExtendBaseWidget(e)
	e.Wrapping, e.Scroll = fyne.TextWrapOff, fyne.ScrollNone
	e.OnSubmitted = func(string) { e.commit() }
	return e
}

func readPoints(text string) (float64, error) {
	x, err := strconv.ParseFloat(strings.Replace(strings.TrimSpace(text), ",", ".", 1), 64)
	if err != nil || math.IsNaN(x) || x < 0 || x > 1e6 {
		return 0, fmt.Errorf("%q is no weight: type swing points, a number from 0 up", text)
	}
	return x, nil
}

func (e *pointEntry) set(points float64) {
	if e.focused && e.Text != pointWords(e.points) {
		e.points = points
		return // what is being typed stays
	}
	e.points = points
	if words := pointWords(points); e.Text != words {
		e.SetText(words)
	}
}

func (e *pointEntry) commit() {
	x, err := readPoints(e.Text)
	if err != nil || pointWords(x) == pointWords(e.points) {
		if err != nil {
			e.refused(err)
		}
		e.SetText(pointWords(e.points))
		return
	}
	e.points = x
	e.settled(x)
}

// FocusGained implements fyne.Focusable.
func (e *pointEntry) FocusGained() {
	e.focused = true
	e.Entry.FocusGained()
}

// FocusLost implements fyne.Focusable; what was typed counts.
func (e *pointEntry) FocusLost() {
	e.focused = false
	e.Entry.FocusLost()
	e.commit()
}

// TypedKey implements fyne.Focusable; escape puts back what was there.
func (e *pointEntry) TypedKey(k *fyne.KeyEvent) {
	if k.Name == fyne.KeyEscape {
		e.SetText(pointWords(e.points))
		return
	}
	e.Entry.TypedKey(k)
}

// unreadyRow is a consequence that voices weigh but that has no usable value scale.
type unreadyRow struct {
	key    string
	reason *widgets.Line
	box    *fyne.Container
}

func newUnreadyRow(s *stage, key string) *unreadyRow {
	r := &unreadyRow{key: key, reason: widgets.Warm("")}
	info := s.c.Info(key)
	title := widgets.NewLine(info.Title).Hinted(info.Sentence)
	title.Bold = true
	set := widget.NewButton("Set the ends…", func() { askScale(s, key) })
	r.box = container.New(free{
		min: func() fyne.Size { return fyne.NewSize(380, weightHeight) },
		place: func(size fyne.Size) {
			b := set.MinSize()
			put(title, 0, 2, size.Width-b.Width-10, 19)
			put(r.reason, 0, 21, size.Width-b.Width-10, 17)
			put(set, size.Width-b.Width, 4, b.Width, b.Height)
		},
	}, title, r.reason, set)
	return r
}
