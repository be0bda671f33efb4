package strip

import (
	"fmt"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
)

// Strip is the foot of the window: one cell for every consequence, for up to four candidates. It has no
// way to be closed. A cell opens into formula, inputs, sources, uncertainty.
type Strip struct {
	widget.BaseWidget
	// OnTaller asks the window to give the strip more or less room.
	OnTaller func(taller bool)

	c      *core.Core
	grid   *grid
	unfold *unfolding
	names  *fyne.Container
	body   *fyne.Container
	scroll *container.Scroll
	taller *widget.Button
	high   bool
	all    fyne.CanvasObject
}

// New makes the strip.
func New(c *core.Core) *Strip {
	s := &Strip{c: c, names: container.New(layout.NewCustomPaddedHBoxLayout(16))}
	s.grid = newGrid(c, s.open)
	s.unfold = newUnfolding(c, s.fold)
	s.scroll = container.NewVScroll(s.grid)
	s.body = container.NewStack(s.scroll)
	s.taller = widget.NewButtonWithIcon("Taller", toolkit.MoveUpIcon(), func() { s.SetHigh(!s.high) })
	s.taller.Importance = widget.LowImportance
	title := widgets.Part("Consequences").Wide()
	title.Hint = "What follows from each chosen candidate, by account. Click a consequence to unfold it into formula, inputs, sources and uncertainty."
	head := container.NewBorder(nil, nil, title, s.taller, container.NewHScroll(s.names))
	s.all = container.NewBorder(container.New(layout.NewCustomPaddedLayout(2, 0, 12, 6), head), nil, nil, nil, container.New(layout.NewCustomPaddedLayout(2, 4, 12, 6), s.body))
	s.ExtendBaseWidget(s)
	c.OnChange(s.changed)
	return s
}

// CreateRenderer implements fyne.Widget.
func (s *Strip) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(s.all) }

// MinSize keeps the strip from being pushed shut.
func (s *Strip) MinSize() fyne.Size { return fyne.NewSize(400, 128) }

// SetHigh tells the strip whether it is tall, and asks the window for the room.
func (s *Strip) SetHigh(high bool) {
	s.high = high
	s.taller.SetText(map[bool]string{false: "Taller", true: "Lower"}[high])
	s.taller.SetIcon(map[bool]fyne.Resource{false: toolkit.MoveUpIcon(), true: toolkit.MoveDownIcon()}[high])
	if s.OnTaller != nil {
		s.OnTaller(high)
	}
}

func (s *Strip) changed(ch core.Change) {
	if ch&(core.SelectionChanged|core.StudyChanged|core.LookChanged) != 0 {
		s.grid.fill()
		s.head()
		s.unfold.refill()
		s.scroll.Refresh()
	} else if ch&(core.RankingChanged|core.ShadeChanged) != 0 {
		s.head()
	}
}

// head names the chosen candidates with their scores; a score stands nowhere without the strip.
func (s *Strip) head() {
	s.names.RemoveAll()
	chosen := s.c.Chosen()
	v := s.c.View()
	if len(chosen) == 0 {
		words := "Choose a parcel on the map, or a row of a table."
		switch {
		case v == nil:
		case v.Problem != nil:
			words = "Nothing is computed: " + strings.SplitN(present.Problem(v.Problem), ";", 2)[0]
		case v.Results == nil && v.Stopped:
			words = "Nothing is computed: it was stopped."
		case v.Results == nil:
			words = "Being computed. What follows from each candidate stands here when it is done."
		}
		s.names.Add(widgets.Faint(words).Wide())
		s.names.Refresh()
		return
	}
	for i, cand := range chosen {
		name := widgets.NewLine(s.c.CandidateTitle(cand)).Wide()
		name.Bold, name.TextSize = true, 12.5
		if len(chosen) > 2 { // four must find room side by side
			name.Set(cand.Site)
		}
		name.Hint = strings.TrimSpace(s.c.CandidateTitle(cand) + "\n" + strings.Join(s.flags(cand), "\n"))
		badge := widgets.NewBadge(core.Letter(i))
		row := container.New(layout.NewCustomPaddedHBoxLayout(8), badge, name, widgets.Faint(s.score(cand, len(chosen) > 2)).Hinted(s.score(cand, false)).Wide())
		if len(cand.OverLimit) > 0 {
			row.Add(widgets.Warm("over a limit").Hinted(strings.Join(s.flags(cand), "\n")).Wide())
		} else if len(cand.Incomplete) > 0 {
			row.Add(widgets.Warm("incomplete").Hinted(strings.Join(s.flags(cand), "\n")).Wide())
		}
		if len(chosen) > 1 {
			id := cand.ID()
			out := widget.NewButtonWithIcon("", toolkit.CancelIcon(), func() { s.c.Toggle(id) })
			out.Importance = widget.LowImportance
			row.Add(out)
		}
		s.names.Add(row)
	}
	if nothing, ok := s.nothing(); ok {
		s.names.Add(widgets.Faint("doing nothing: " + nothing).Hinted("Doing nothing spares every burden and brings no gain. It is weighed like any candidate.").Wide())
	}
	if len(chosen) == 1 {
		s.names.Add(widgets.Faint("Ctrl-click adds another").Wide())
	}
	if v != nil && !v.Current {
		s.names.Add(widgets.Warm("figures of the state before the last change").Wide())
	}
	s.names.Refresh()
}

// score writes place and score under the weights shown; in short without the range.
func (s *Strip) score(cand *run.Candidate, short bool) string {
	switch {
	case cand.Status != run.Fitted && cand.Reason != "":
		return present.Named(cand.Status) + ": " + present.Reason(cand.Reason)
	case cand.Status != run.Fitted:
		return present.Named(cand.Status)
	}
	r := s.c.Ranking()
	if r == nil || r.Err != nil {
		return "no order yet"
	}
	item := int32(-1)
	if at, ok := s.c.View().Index.ByID[cand.ID()]; ok {
		item = r.Board.ItemOf[at]
	}
	st := &r.Standing
	switch {
	case item < 0:
		return "held back by a gate"
	case short:
		return fmt.Sprintf("place %d, %.2f", st.Place[item], st.Score[item])
	}
	return fmt.Sprintf("place %d, score %.2f (%.2f to %.2f)", st.Place[item], st.Score[item], st.Low[item], st.High[item])
}

func (s *Strip) nothing() (string, bool) {
	r := s.c.Ranking()
	if r == nil || r.Err != nil {
		return "", false
	}
	item := len(r.Board.IDs) - 1 // the last item is doing nothing
	return fmt.Sprintf("place %d, score %.2f", r.Standing.Place[item], r.Standing.Score[item]), r.Board.At[item] < 0
}

// flags says what wants attention in a candidate.
func (s *Strip) flags(cand *run.Candidate) []string {
	var out []string
	for _, k := range cand.OverLimit {
		out = append(out, "Over the limit: "+s.c.Info(k).Title)
	}
	for _, k := range cand.Incomplete {
		name := k
		if !strings.Contains(k, ".") {
			name = present.Rule(k)
		}
		out = append(out, "Computed without: "+name+" (not set)")
	}
	for _, n := range cand.Notices {
		out = append(out, present.Sentence(n, nil))
	}
	return out
}

// open unfolds a consequence of a chosen candidate.
func (s *Strip) open(key string, candidate int) {
	s.unfold.show(key, candidate)
	split := container.NewHSplit(s.scroll, s.unfold.all)
	split.SetOffset(0.5)
	s.body.Objects = []fyne.CanvasObject{split}
	s.body.Refresh()
	if !s.high {
		s.SetHigh(true)
	}
}

// fold shows the cells alone again.
func (s *Strip) fold() {
	s.body.Objects = []fyne.CanvasObject{s.scroll}
	s.body.Refresh()
	if s.high {
		s.SetHigh(false)
	}
}

func capitals(s string) string { return strings.ToUpper(s) }

func withUnit(figure, unit string) string {
	return strings.TrimSpace(figure + " " + present.Unit(unit))
}
