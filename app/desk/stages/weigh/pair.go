package weigh

import (
	"fmt"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/present"
	"groundtally/scoring"
	weighing "groundtally/scoring/weigh"
)

// pair is what is found of two candidates against each other.
type pair struct {
	problem string // why there is nothing to compare
	chart   chart.Pair
	behind  string // letter of the one with the lower score
	lead    string // how the two stand
	factor  string // how far all weights would have to be off
	needs   []need
}

// need is what would have to be true of one consequence for the one behind to lead.
type need struct {
	title, sentence string
	weight, value   string
}

// comparePair finds how the first two ids stand against each other under the order shown.
func comparePair(sh *shown, ids [2]string, titles [2]string) pair {
	var items [2]int
	for i, id := range ids {
		item, ok := sh.item(id)
		if !ok {
			why := "is not in the order"
			if at, there := sh.Index.ByID[id]; there && sh.results.Candidates[at].Status != "" {
				why += ": " + present.Named(sh.results.Candidates[at].Status)
			}
			return pair{problem: fmt.Sprintf("%s, %s, %s. Choose another one.", core.Letter(i), titles[i], why)}
		}
		items[i] = item
	}
	p := pair{chart: chart.Pair{Title: titles[0] + " against " + titles[1], ID: "pair", NameA: titles[0], NameB: titles[1]}}
	w := sh.Standing.Weights
	values := [2][]float64{}
	for i, item := range items {
		for k := range sh.Board.Keys {
			part := sh.Board.Part(item, k)
			v := part.Mid
			if !part.Known {
				v = 0.5
			}
			values[i] = append(values[i], v)
		}
	}
	for k, key := range sh.Board.Keys {
		if w[k] == 0 {
			continue
		}
		pa, pb := sh.Board.Part(items[0], k), sh.Board.Part(items[1], k)
		a, _ := sh.candidate(items[0]).Consequence(key.Info.Key)
		b, _ := sh.candidate(items[1]).Consequence(key.Info.Key)
		p.chart.Keys = append(p.chart.Keys, chart.PairKey{Item: key.Info.Key, Title: key.Info.Title, A: present.Value(a), B: present.Value(b), Difference: w[k] * (values[0][k] - values[1][k]),
			Unknown: !pa.Known || !pb.Known, OverA: pa.OverLimit, OverB: pb.OverLimit})
	}
	ahead, behind := 0, 1
	if sh.Standing.Place[items[1]] < sh.Standing.Place[items[0]] {
		ahead, behind = 1, 0
	}
	p.behind = core.Letter(behind)
	st := &sh.Standing
	p.lead = fmt.Sprintf("%s scores %s (%s to %s), place %d; %s scores %s (%s to %s), place %d.",
		core.Letter(0), scoreWords(st.Score[items[0]]), scoreWords(st.Low[items[0]]), scoreWords(st.High[items[0]]), st.Place[items[0]],
		core.Letter(1), scoreWords(st.Score[items[1]]), scoreWords(st.Low[items[1]]), scoreWords(st.High[items[1]]), st.Place[items[1]])
	if st.Tier[items[0]] == st.Tier[items[1]] {
		p.lead += " They share a tier and cannot be told apart."
	}
	delta := make([]float64, len(w))
	for k := range w {
		delta[k] = values[behind][k] - values[ahead][k]
	}
	if f, ok := weighing.ReversalFactor(w, delta); ok && f >= 1 {
		p.factor = fmt.Sprintf("All weights at once: %s would lead if every weight that favours it were %.2f times as large and every one that favours %s smaller by the same factor.", p.behind, f, core.Letter(ahead))
	} else if !ok {
		p.factor = fmt.Sprintf("No weights put %s before %s: it is better in nothing that is weighed.", p.behind, core.Letter(ahead))
	}
	for k, key := range sh.Board.Keys {
		n := need{title: key.Info.Title, sentence: key.Info.Sentence, weight: weightNeeded(sh, values[ahead], values[behind], k)}
		q, _ := sh.candidate(items[behind]).Consequence(key.Info.Key)
		n.value = valueNeeded(sh, values[ahead], values[behind], k, q)
		p.needs = append(p.needs, n)
	}
	return p
}

// weightNeeded says with which swing points of a key the one behind leads, the points of the others as
// they are.
func weightNeeded(sh *shown, ahead, behind []float64, k int) string {
	w := sh.Standing.Weights
	now := "now " + pointWords(sh.Raw[k])
	lo, hi, ok, err := weighing.WeightNeeded(w, ahead, behind, k)
	others := total(sh.Raw) - sh.Raw[k]
	switch {
	case err != nil || !ok || others == 0:
		return "no weight of it changes who leads; " + now
	case lo <= w[k] && w[k] <= hi:
		return "level as it is; " + now
	case lo > w[k]:
		if at, ok := pointsAt(lo, others); ok && at < 1e4 {
			return "above " + pointWords(at) + " swing points; " + now
		}
		return "only with all the weight on it; " + now
	}
	at, _ := pointsAt(hi, others)
	return "below " + pointWords(at) + " swing points; " + now
}

// valueNeeded says which value of a key would put the one behind level.
func valueNeeded(sh *shown, ahead, behind []float64, k int, q scoring.Consequence) string {
	key := sh.Board.Keys[k]
	now := "now " + present.Value(q)
	if sh.Standing.Weights[k] == 0 {
		return "it has no weight, so its value changes nothing; " + now
	}
	v, ok, err := weighing.ValueNeeded(sh.Standing.Weights, ahead, behind, k)
	if err != nil || !ok {
		return "no value of it is enough; " + now
	}
	way := "or more"
	if key.Best < key.Worst {
		way = "or less"
	}
	return amount(key.Worst+v*(key.Best-key.Worst), key.Info.Unit) + " " + way + "; " + now
}

// pairPane is the part of the stage that sets two candidates against each other.
type pairPane struct {
	s       *stage
	work    latest
	pair    pair
	words   *widget.Label
	swap    *widget.Button
	take    *widget.Button
	picture *picture
	needs   *fyne.Container
	duel    *duel
	body    *fyne.Container
	all     *container.Scroll
}

func newPair(s *stage) *pairPane {
	p := &pairPane{s: s, words: widgets.NewText("")}
	p.swap = widget.NewButton("Swap A and B", func() {
		if ids := s.c.ChosenIDs(); len(ids) > 1 {
			ids[0], ids[1] = ids[1], ids[0]
			s.c.Choose(ids...)
		}
	})
	p.take = widget.NewButton("Take the first two of the order", p.firstTwo)
	p.picture = newPicture(s.c, p.grown)
	p.needs = container.NewVBox()
	p.duel = newDuel(s, p.grown)
	p.body = container.NewVBox(flush(p.words), container.NewHBox(p.swap, p.take), p.picture, p.duel.all, p.needs)
	p.all = container.NewVScroll(container.New(inset{right: 12, bottom: 8}, p.body))
	return p
}

func (p *pairPane) object() fyne.CanvasObject { return p.all }

// grown lays the pane out anew after something in it took another height.
func (p *pairPane) grown() {
	p.body.Refresh() // in a high window the whole keeps its height
	p.all.Refresh()
}

// firstTwo chooses the first two candidates of the order.
func (p *pairPane) firstTwo() {
	var ids []string
	if sh := p.s.shown; sh != nil && sh.Err == nil {
		for _, item := range sh.Standing.Order {
			if sh.candidate(item) != nil && len(ids) < 2 {
				ids = append(ids, sh.Board.IDs[item])
			}
		}
	}
	p.s.c.Choose(ids...)
}

func (p *pairPane) changed(core.Change) {
	sh, ids := p.s.shown, p.s.c.ChosenIDs()
	two := sh != nil && sh.Err == nil && len(ids) > 1
	show(p.swap, len(ids) > 1)
	show(p.take, len(ids) < 2 && sh != nil && sh.Err == nil)
	p.duel.update()
	if !two {
		words := "Two candidates are set against each other here. Choose one by a click in the order or on the map, then the other by a click with Ctrl or Shift held (or + in the order)."
		if sh == nil || sh.Err != nil {
			words = "There is no order yet; give weights first."
		}
		p.show(pair{problem: words})
		return
	}
	pairIDs := [2]string{ids[0], ids[1]}
	titles := [2]string{p.s.c.IDTitle(ids[0]), p.s.c.IDTitle(ids[1])}
	p.work.ask(p.s.c, nil, func() func() {
		found := comparePair(sh, pairIDs, titles)
		return func() { p.show(found) }
	})
}

func (p *pairPane) show(found pair) {
	p.pair = found
	words := found.lead
	if found.problem != "" {
		words = found.problem
	}
	if p.words.Text != words {
		p.words.SetText(words)
	}
	show(p.picture, found.problem == "")
	p.needs.Objects = nil
	if found.problem == "" {
		p.picture.set(func(palette draw.Palette, width float64) *draw.Scene {
			return chart.PairBars(found.chart, palette, width)
		})
		p.needs.Add(widgets.Part("What would have to be true for " + found.behind + " to lead"))
		p.needs.Add(flush(widgets.NewText("One thing at a time, all else as it is. An unknown value counts half, as in the score.")))
		for _, n := range found.needs {
			p.needs.Add(needRow(n, found.behind))
		}
		if found.factor != "" {
			p.needs.Add(flush(widgets.NewText(found.factor)))
		}
	}
	p.grown()
}

// needRow sets weight and value side by side where there is room, else one under the other.
func needRow(n need, behind string) fyne.CanvasObject {
	title := widgets.NewLine(n.title).Hinted(n.sentence)
	title.Bold = true
	weight, value := widgets.Faint("Weight: "+n.weight), widgets.Faint("Value of "+behind+": "+n.value)
	wide := func(size fyne.Size) bool { return size.Width >= wideRow }
	return container.New(free{
		min: func() fyne.Size { return fyne.NewSize(300, 56) },
		place: func(size fyne.Size) {
			if wide(size) {
				put(title, 0, 10, size.Width*0.28, 19)
				put(weight, size.Width*0.3, 2, size.Width*0.7, 18)
				put(value, size.Width*0.3, 20, size.Width*0.7, 18)
				return
			}
			put(title, 0, 0, size.Width, 19)
			put(weight, 0, 18, size.Width, 18)
			put(value, 0, 35, size.Width, 18)
		},
	}, title, weight, value)
}
