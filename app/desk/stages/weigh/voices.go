package weigh

import (
	"fmt"
	"math"
	"slices"
	"strconv"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/run"
	"groundtally/app/study"
	weighing "groundtally/scoring/weigh"
)

const firstPlaces = 5

// voiceColumn is what one voice says.
type voiceColumn struct {
	voice, title string
	problem      string
	first        []run.Row
	ordered      int
	chosen       []*run.Row // by chosen candidate; nil for one that is not ordered
}

// voiceColumns finds the first places of every voice, and where the chosen candidates stand.
func voiceColumns(results *run.Results, snap *study.Snapshot, chosen []*run.Candidate) []voiceColumn {
	var out []voiceColumn
	for _, voice := range snap.Voices() {
		col := voiceColumn{voice: voice, title: snap.Text("voice." + voice + ".title"), chosen: make([]*run.Row, len(chosen))}
		if col.title == "" {
			col.title = voice
		}
		if err := results.Unready[voice]; err != nil {
			col.problem = unreadyWords(err)
		}
		for i := range results.Voices {
			o := &results.Voices[i]
			if o.Voice != voice {
				continue
			}
			col.first, col.ordered = o.Order[:min(firstPlaces, len(o.Order))], len(o.Order)
			for j := range o.Order {
				for k, c := range chosen {
					if r := &o.Order[j]; r.Site == c.Site && r.Plant == c.Plant {
						col.chosen[k] = r
					}
				}
			}
		}
		out = append(out, col)
	}
	return out
}

// quarrel says where the voices disagree over two candidates.
type quarrel struct {
	leads  []string // by voice, in words
	shares []string // by consequence, the largest first
	words  string   // in place of the shares
}

// disagree finds where the voices disagree over the first two of the chosen candidates.
func disagree(sh *shown, ids [2]string, voiceTitles map[string]string) quarrel {
	var delta []float64
	a, okA := sh.item(ids[0])
	b, okB := sh.item(ids[1])
	if !okA || !okB {
		return quarrel{words: "One of the two is not in the order, so there is nothing to disagree about."}
	}
	value := func(item, k int) float64 {
		if p := sh.Board.Part(item, k); p.Known {
			return p.Mid
		}
		return 0.5
	}
	for k := range sh.Board.Keys {
		delta = append(delta, value(a, k)-value(b, k))
	}
	var groups [][]float64
	var titles []string
	for _, voice := range sh.snap.Voices() {
		w, err := weighing.Swing(sh.Board.Raw(sh.snap, voice))
		if err != nil {
			continue // weighs nothing
		}
		groups, titles = append(groups, w), append(titles, voiceTitles[voice])
	}
	if len(groups) < 2 {
		return quarrel{words: "It takes two voices with weights to disagree."}
	}
	d, shares, err := weighing.Disagreement(groups, delta)
	if err != nil {
		return quarrel{words: "Where the voices disagree cannot be told: " + err.Error()}
	}
	q := quarrel{}
	for i, x := range d {
		q.leads = append(q.leads, titles[i]+": "+leadOf(x))
	}
	if shares == nil {
		q.words = "All voices see the same difference; there is no quarrel to share out."
		return q
	}
	order := make([]int, len(shares))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int {
		switch {
		case math.Abs(shares[i]) > math.Abs(shares[j]):
			return -1
		case math.Abs(shares[i]) < math.Abs(shares[j]):
			return 1
		}
		return 0
	})
	for _, k := range order {
		if math.Round(100*shares[k]) == 0 {
			continue
		}
		words := sh.Board.Keys[k].Info.Title + ": " + percentWords(shares[k]) + " of the quarrel"
		if shares[k] < 0 {
			words += " (it damps it)"
		}
		q.shares = append(q.shares, words)
	}
	return q
}

func leadOf(d float64) string {
	switch {
	case d >= 0.005:
		return "A is ahead by " + scoreWords(d)
	case d <= -0.005:
		return "B is ahead by " + scoreWords(-d)
	}
	return "A and B are level"
}

// voicesPane sets the voices side by side.
type voicesPane struct {
	s       *stage
	work    latest
	columns []voiceColumn
	quarrel quarrel
	words   *widget.Label
	grid    *fyne.Container
	below   *fyne.Container
	all     *container.Scroll
}

func newVoices(s *stage) *voicesPane {
	p := &voicesPane{s: s, words: widgets.NewText(""), grid: container.New(sideBySide{}), below: container.NewVBox()}
	p.all = container.NewVScroll(container.New(inset{right: 12, bottom: 8}, container.NewVBox(flush(p.words), container.NewHScroll(p.grid), p.below)))
	return p
}

func (p *voicesPane) object() fyne.CanvasObject { return p.all }

func (p *voicesPane) changed(core.Change) {
	v, sh := p.s.c.View(), p.s.shown
	if v == nil || v.Results == nil {
		p.words.SetText("The voices stand side by side here once the study is computed.")
		return
	}
	results, snap, chosen, ids := v.Results, v.Of, p.s.c.Chosen(), p.s.c.ChosenIDs()
	titles := map[string]string{}
	for _, voice := range snap.Voices() {
		titles[voice] = p.s.c.VoiceTitle(voice)
	}
	p.work.ask(p.s.c, nil, func() func() {
		columns := voiceColumns(results, snap, chosen)
		var q quarrel
		if sh != nil && len(ids) > 1 {
			q = disagree(sh, [2]string{ids[0], ids[1]}, titles)
		}
		return func() {
			p.columns, p.quarrel = columns, q
			p.show(chosen)
		}
	})
}

func (p *voicesPane) show(chosen []*run.Candidate) {
	words := "Each with its saved weights: the first places, first in … of 100 weight mixes."
	if !p.s.c.View().Current {
		words = "Being brought up to date. " + words
	}
	if p.words.Text != words {
		p.words.SetText(words)
	}
	p.grid.Objects = nil
	for _, col := range p.columns {
		p.grid.Objects = append(p.grid.Objects, p.column(col, chosen))
	}
	p.grid.Refresh()
	p.below.Objects = nil
	p.below.Add(container.New(inset{top: 8}, newRule()))
	p.below.Add(widgets.Part("Where the voices disagree"))
	switch ids := p.s.c.ChosenIDs(); {
	case len(ids) < 2:
		p.below.Add(flushed("Choose two candidates to see which consequences the voices disagree about: one by a click, the other by a click with Ctrl or Shift held."))
	default:
		p.below.Add(flushed("Over A, " + p.s.c.IDTitle(ids[0]) + ", against B, " + p.s.c.IDTitle(ids[1]) + ":"))
		for _, l := range p.quarrel.leads {
			p.below.Add(indented(widgets.NewLine(l)))
		}
		if len(p.quarrel.shares) > 0 {
			p.below.Add(flushed("The voices' differences rest on:"))
		}
		for _, l := range p.quarrel.shares {
			p.below.Add(indented(widgets.NewLine(l)))
		}
		if p.quarrel.words != "" {
			p.below.Add(flushed(p.quarrel.words))
		}
	}
	p.all.Refresh()
}

func flushed(words string) fyne.CanvasObject { return flush(widgets.NewText(words)) }

func indented(l *widgets.Line) fyne.CanvasObject { return container.New(inset{left: 18}, l) }

func (p *voicesPane) column(col voiceColumn, chosen []*run.Candidate) fyne.CanvasObject {
	pill := widgets.NewPill(col.title, func() { p.s.c.SetVoice(col.voice) })
	pill.Chosen = col.voice == p.s.c.Voice()
	box := container.NewVBox(container.New(free{
		min:   func() fyne.Size { return fyne.NewSize(110, pill.MinSize().Height) }, // a long title is not worth a wide column
		place: func(size fyne.Size) { put(pill, 0, 0, size.Width, size.Height) },
	}, pill))
	if col.problem != "" {
		box.Add(flushed(col.problem))
		return box
	}
	for i := range col.first {
		r := &col.first[i]
		title, plant := r.Site, p.s.c.PlantTitle(r.Plant)
		if r.Site == run.NoSite {
			title, plant = "Doing nothing", "no plant"
		}
		box.Add(p.placeRow(strconv.Itoa(r.Place), title, plant, p.s.chosenLetter(r.Site+"/"+r.Plant), r))
	}
	for i, r := range col.chosen {
		if i == 0 {
			box.Add(newRule())
		}
		line := widgets.NewLine(core.Letter(i) + " not in the order")
		if r != nil {
			line.Text = fmt.Sprintf("%s place %d of %d", core.Letter(i), r.Place, col.ordered)
			line.Hint = fmt.Sprintf("%s: place %d of %d under %s, score %s (%s to %s), first in %s of 100 weight mixes.", p.s.c.CandidateTitle(chosen[i]), r.Place, col.ordered, col.title,
				scoreWords(r.Score), scoreWords(r.ScoreLow), scoreWords(r.ScoreHigh), share100(r.FirstIn100))
		}
		box.Add(line)
	}
	return box
}

func (p *voicesPane) placeRow(place, title, plant, letter string, r *run.Row) fyne.CanvasObject {
	number, name, second, first := widgets.NewLine(place), widgets.NewLine(title), widgets.Faint(plant), widgets.Faint(share100(r.FirstIn100))
	number.Bold, name.Bold = true, true
	first.Align = fyne.TextAlignTrailing
	first.Hint = fmt.Sprintf("First in %s of 100 weight mixes; score %s (%s to %s).", share100(r.FirstIn100), scoreWords(r.Score), scoreWords(r.ScoreLow), scoreWords(r.ScoreHigh))
	if len(r.OverLimit) > 0 {
		second = widgets.Warm(plant + ", over a limit")
	}
	b := newBadge()
	b.set(letter)
	bar := newShareBar()
	bar.set(r.FirstIn100 / 100)
	return container.New(free{
		min: func() fyne.Size { return fyne.NewSize(110, 38) },
		place: func(size fyne.Size) {
			put(number, 2, 0, 16, 19)
			name0 := float32(20)
			if letter != "" {
				put(b, 20, 1, 17, 17)
				name0 = 41
			}
			last := float32(26)
			if size.Width >= 145 {
				last = 58
			}
			show(bar, size.Width >= 145)
			put(name, name0, 0, size.Width-name0-last, 19)
			put(bar, size.Width-54, 8, 26, 4)
			put(first, size.Width-26, 0, 24, 19)
			put(second, 20, 18, size.Width-22, 17)
		},
	}, number, b, name, second, bar, first)
}

// sideBySide gives every object the same width, as much as there is room for.
type sideBySide struct{}

const columnGap = 14

func (sideBySide) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	n := float32(max(len(objects), 1))
	w := (size.Width - 3 - columnGap*(n-1)) / n // round ends are not cut at the edge
	for i, o := range objects {
		put(o, float32(i)*(w+columnGap), 0, w, size.Height)
	}
}

func (sideBySide) MinSize(objects []fyne.CanvasObject) fyne.Size {
	var one fyne.Size
	for _, o := range objects {
		one = one.Max(o.MinSize())
	}
	n := float32(len(objects))
	return fyne.NewSize(n*one.Width+columnGap*max(n-1, 0), one.Height)
}
