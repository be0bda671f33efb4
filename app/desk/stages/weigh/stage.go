package weigh

import (
	"errors"
	"fmt"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/run"
	"groundtally/app/study"
)

// pane is one of the parts of the stage that the pills choose from.
type pane interface {
	object() fyne.CanvasObject
	changed(core.Change)
}

// The pills, in order.
const (
	weightsTab = iota
	orderTab
	pairTab
	voicesTab
	scatterTab
	besidesTab
	tabCount
)

type stage struct {
	c       *core.Core
	content *fyne.Container
	head    *head
	tabs    *widgets.Tabs
	panes   [tabCount]pane
	missed  [tabCount]core.Change // by panes while they were not shown

	shown  *shown
	facts  *facts
	trying bool
	looks  int    // how often light and dark changed
	work   latest // finds facts
}

// New makes the stage.
func New(c *core.Core) core.Stage { return &stage{c: c} }

// shown is an order with the results that it is of. The study's newest results may be ahead of it by the
// moment that ranking them takes, and indexes of the one do not fit the other.
type shown struct {
	*live.Ranking
	snap    *study.Snapshot
	results *run.Results
	itemOf  []int32         // by candidate: its item, -1 for one that is not ordered
	of      *study.Snapshot // that the results are of; snap may be ahead of it
}

func (s *shown) candidate(item int) *run.Candidate {
	if at := s.Board.At[item]; at >= 0 {
		return &s.results.Candidates[at]
	}
	return nil
}

// item finds what is ordered under an id.
func (s *shown) item(id string) (int, bool) {
	at, ok := s.Index.ByID[id]
	if !ok || s.itemOf[at] < 0 {
		return 0, false
	}
	return int(s.itemOf[at]), true
}

// facts is what was computed of the saved order: first in N of 100, dominance, tipping weights.
type facts struct {
	order *run.VoiceOrder
	rowOf []int32 // by item: its row in the order, -1 for none
}

func (f *facts) row(item int) *run.Row {
	if f == nil || item >= len(f.rowOf) || f.rowOf[item] < 0 {
		return nil
	}
	return &f.order.Order[f.rowOf[item]]
}

func findFacts(s *shown, o *run.VoiceOrder) *facts {
	f := &facts{order: o, rowOf: make([]int32, len(s.Board.IDs))}
	for i := range f.rowOf {
		f.rowOf[i] = -1
	}
	nothing := len(s.Board.IDs) - 1 // the board ends with doing nothing
	for i := range o.Order {
		r := &o.Order[i]
		if r.Site == run.NoSite {
			f.rowOf[nothing] = int32(i)
		} else if item, ok := s.item(r.Site + "/" + r.Plant); ok {
			f.rowOf[item] = int32(i)
		}
	}
	return f
}

// Title implements core.Stage.
func (s *stage) Title() string { return "Weigh" }

// State implements core.Stage.
func (s *stage) State() (first, second string, warn bool) {
	v := s.c.View()
	if v == nil {
		return "", "", false
	}
	voices := v.Snap.Voices()
	if len(voices) == 0 {
		return "no voice yet", "add one to weigh", true
	}
	first = plural(len(voices), "voice")
	if v.Results == nil {
		return first, "not computed yet", false
	}
	leaders := map[string]bool{}
	for i := range v.Results.Voices {
		if o := v.Results.Voices[i].Order; len(o) > 0 {
			leaders[o[0].Site+"/"+o[0].Plant] = true
		}
	}
	if len(leaders) > 0 {
		first += ", " + plural(len(leaders), "first place")
	}
	title := s.c.VoiceTitle(s.c.Voice())
	switch err := v.Results.Unready[s.c.Voice()]; {
	case s.c.Trying():
		return first, "weights being tried out", true
	case err != nil:
		return first, title + ": " + unreadyWords(err), true
	case !v.Current:
		return first, "being brought up to date", false
	}
	if o := s.c.Order(); o != nil && len(o.Order) > 0 {
		top := o.Order[0]
		name := top.Site
		if top.Site == run.NoSite {
			name = "Doing nothing"
		}
		return first, fmt.Sprintf("%s: %s of 100 mixes", name, share100(top.FirstIn100)), false
	}
	return first, "", false
}

// Content implements core.Stage.
func (s *stage) Content() fyne.CanvasObject {
	if s.content != nil {
		return s.content
	}
	s.take()
	s.head = newHead(s)
	makers := [tabCount]struct {
		text string
		make func() pane
	}{
		weightsTab: {"Weights", func() pane { return newWeights(s) }},
		orderTab:   {"Order", func() pane { return newOrder(s) }},
		pairTab:    {"A against B", func() pane { return newPair(s) }},
		voicesTab:  {"Voices", func() pane { return newVoices(s) }},
		scatterTab: {"Scatter", func() pane { return newScatter(s) }},
		besidesTab: {"Saving, gates", func() pane { return newBesides(s) }},
	}
	tabs := make([]widgets.Tab, tabCount)
	for i, m := range makers {
		tabs[i] = widgets.Tab{Text: m.text, Make: func() fyne.CanvasObject {
			s.panes[i] = m.make()
			s.panes[i].changed(core.Everything)
			return container.New(inset{top: 8}, s.panes[i].object())
		}}
	}
	s.tabs = widgets.NewTabs(tabs...)
	s.tabs.OnChosen = func(i int) {
		ch := s.missed[i]
		s.missed[i] = 0
		if ch != 0 {
			s.panes[i].changed(ch)
		}
	}
	s.content = container.New(inset{14, 10, 14, 6}, container.NewBorder(s.head.object(), nil, nil, nil, s.tabs))
	s.head.update()
	return s.content
}

// Changed implements core.Stage.
func (s *stage) Changed(ch core.Change) {
	s.take()
	if s.content == nil {
		return
	}
	if t := s.c.Trying(); t != s.trying {
		s.trying = t
		ch |= core.RankingChanged
	}
	s.head.update()
	if ch&^core.WorkChanged != 0 {
		s.tell(ch)
	}
}

func (s *stage) tell(ch core.Change) {
	if ch&core.LookChanged != 0 {
		s.looks++
	}
	for i, p := range s.panes {
		switch {
		case p == nil:
		case i == s.tabs.Chosen():
			p.changed(ch)
		default:
			s.missed[i] |= ch
		}
	}
	if ch&core.LookChanged != 0 {
		s.content.Refresh()
	}
}

// take takes over the order that the core has now, and has the facts on the saved one found.
func (s *stage) take() {
	v, r := s.c.View(), s.c.Ranking()
	switch {
	case r == nil || v == nil:
		s.shown, s.facts = nil, nil
		return
	case s.shown != nil && s.shown.Ranking == r:
	case r.Board != v.Board || v.Results == nil:
		return // the order of the newest results is on its way
	case s.shown != nil && s.shown.Board == r.Board:
		s.shown = &shown{r, v.Snap, v.Results, s.shown.itemOf, v.Of}
	default:
		itemOf := make([]int32, len(v.Results.Candidates))
		for i := range itemOf {
			itemOf[i] = -1
		}
		for item, at := range r.Board.At {
			if at >= 0 {
				itemOf[at] = int32(item)
			}
		}
		s.shown = &shown{r, v.Snap, v.Results, itemOf, v.Of}
	}
	o := s.c.Order()
	switch {
	case o == nil || s.shown.results != v.Results:
		s.facts = nil
	case s.facts != nil && s.facts.order == o:
	case s.work.of == o: // being found
		s.facts = nil
	default:
		s.facts = nil
		at := s.shown
		s.work.ask(s.c, o, func() func() {
			f := findFacts(at, o)
			return func() {
				if s.c.Order() == o {
					s.facts = f
					if s.content != nil {
						s.tell(core.RankingChanged)
					}
				}
			}
		})
	}
}

// chosenLetter gives the letter of a chosen candidate, or nothing.
func (s *stage) chosenLetter(id string) string {
	for i, c := range s.c.ChosenIDs() {
		if c == id {
			return core.Letter(i)
		}
	}
	return ""
}

// tryOne shows the order under another weight of one key.
func (s *stage) tryOne(key string, points float64) {
	v := s.c.View()
	if v == nil || v.Board == nil {
		return
	}
	raw := s.c.Raw()
	for i, k := range v.Board.Keys {
		if k.Info.Key == key && raw[i] != points {
			raw[i] = points
			s.c.Try(raw)
			s.Changed(0)
			return
		}
	}
}

// save puts the weights tried out into the study, unless they are all zero, with which nothing can be put
// in order.
func (s *stage) save() {
	if total(s.c.Raw()) > 0 {
		s.c.SaveWeights()
		s.Changed(0)
	}
}

// back drops the weights tried out.
func (s *stage) back() {
	s.c.Back()
	s.Changed(core.RankingChanged)
}

func unreadyWords(err error) string {
	words, _, _ := strings.Cut(err.Error(), ": anchor.")
	var family *run.FamilyError
	if errors.As(err, &family) {
		return "it weighs one event (" + family.Family + ") twice, without a reason"
	}
	if strings.Contains(words, "no fixed ends") {
		return "the ends of a value scale are not set"
	}
	return words
}

// latest does one thing at a time off the window's goroutine; of several asked for meanwhile the newest
// counts. It is used on the window's goroutine alone.
type latest struct {
	of      any // what was asked for last
	running bool
	next    func() func()
}

// ask has work done on another goroutine; what it gives is then run on the window's.
func (l *latest) ask(c *core.Core, of any, work func() func()) {
	l.of, l.next = of, work
	if !l.running {
		l.start(c)
	}
}

func (l *latest) start(c *core.Core) {
	work := l.next
	l.next, l.running = nil, true
	go func() {
		then := work()
		c.Do(func() {
			l.running = false
			if l.next != nil {
				l.start(c)
				return
			}
			l.of = nil
			then()
		})
	}()
}
