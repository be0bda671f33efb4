package appendix

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"runtime/debug"
	"sync"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/run"
	"groundtally/app/study"
)

// Stage is the pane that makes and verifies the appendix, with journal and frozen states.
type Stage struct {
	c    *core.Core
	tabs *widgets.Tabs

	make    *makePane
	journal *journalPane
	frozen  *frozenPane

	job    *job // what is under way; nil when nothing is
	making bool // the job makes the appendix
	now    func() time.Time
}

// New makes the stage.
func New(c *core.Core) *Stage { return &Stage{c: c, now: time.Now} }

// Title implements core.Stage.
func (s *Stage) Title() string { return "Appendix" }

// State implements core.Stage.
func (s *Stage) State() (first, second string, warn bool) {
	v := s.c.View()
	if v == nil {
		return "", "", false
	}
	if s.making {
		return "being made", "", false
	}
	m := s.lastMade()
	switch {
	case m.Code == "":
		return "not made yet", "", false
	case v.Results == nil: // it may be as it was; that is known once it is computed
		return "made " + core.Clock(m.At, s.now()), "", false
	case !v.Current || v.Results.Code.Check != m.Code:
		return "", "not made since change", true
	}
	return "made at " + core.Clock(m.At, s.now()), "", false
}

// Content implements core.Stage.
func (s *Stage) Content() fyne.CanvasObject {
	s.tabs = widgets.NewTabs(
		widgets.Tab{Text: "Make", Make: func() fyne.CanvasObject { s.make = newMakePane(s); return s.make.content }},
		widgets.Tab{Text: "Journal", Make: func() fyne.CanvasObject { s.journal = newJournalPane(s.c, s.now); return s.journal.content }},
		widgets.Tab{Text: "Frozen states", Make: func() fyne.CanvasObject { s.frozen = newFrozenPane(s); return s.frozen.content }},
	)
	return container.New(layout.NewCustomPaddedLayout(12, 4, 12, 8), container.NewBorder(widgets.Heading(s.Title()), nil, nil, nil, s.tabs))
}

// Changed implements core.Stage.
func (s *Stage) Changed(ch core.Change) {
	if ch&(core.StudyChanged|core.WorkChanged) == 0 || s.c.View() == nil {
		return
	}
	if s.make != nil {
		s.make.changed()
	}
	if s.frozen != nil {
		s.frozen.changed()
	}
	if s.journal != nil && ch&core.StudyChanged != 0 {
		s.journal.changed()
	}
}

// made is what is remembered of the appendix that was made last.
type made struct {
	Code   string    `json:"code"`
	At     time.Time `json:"at"`
	Folder string    `json:"folder"`
	Bytes  int       `json:"bytes"`
}

// prefKey is where it is remembered, by the study's file.
func (s *Stage) prefKey() string { return "appendix of " + s.c.View().Path }

// lastMade gives what is remembered of the appendix of this study; its code is empty when there is none.
func (s *Stage) lastMade() (m made) {
	// What cannot be read counts as not there; the appendix is then made anew.
	_ = json.Unmarshal([]byte(s.c.App.Preferences().String(s.prefKey())), &m)
	return m
}

func (s *Stage) remember(m made) {
	b, err := json.Marshal(m)
	if err != nil {
		s.c.Fail("remember the appendix", err)
		return
	}
	s.c.App.Preferences().SetString(s.prefKey(), string(b))
	s.c.Emit(core.WorkChanged) // the rail says so
}

// job is something long that is under way, with a line that shows how far it is.
type job struct {
	c     *core.Core
	shown *progressLine

	mu   sync.Mutex
	told time.Time
}

// start runs something long off the window's goroutine. When it ends, after is called on the window's
// goroutine; one thing is under way at a time.
func (s *Stage) start(line *progressLine, words string, do func(ctx context.Context, told func(what string, done, total int)) error, after func(error)) {
	if s.job != nil {
		return
	}
	ctx, cancel := context.WithCancel(context.Background())
	j := &job{c: s.c, shown: line}
	s.job = j
	line.begin(words, cancel)
	s.Changed(core.WorkChanged)
	go func() {
		err := guarded(func() error { return do(ctx, j.tell) })
		cancel()
		s.c.Do(func() {
			s.job, s.making = nil, false
			line.end()
			after(err)
			s.c.Emit(core.WorkChanged)
		})
	}()
}

// often is how often progress is shown at most.
const often = 100 * time.Millisecond

// tell shows how far it is. It may be called from any goroutine, and often.
func (j *job) tell(what string, done, total int) {
	j.mu.Lock()
	now := time.Now()
	due := now.Sub(j.told) >= often
	if due {
		j.told = now
	}
	j.mu.Unlock()
	if due {
		j.c.Do(func() { j.shown.show(what, done, total) })
	}
}

// guarded turns a panic into an error that carries its stack.
func guarded(do func() error) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = &live.FaultError{What: fmt.Sprint(p), Details: string(debug.Stack())}
		}
	}()
	return do()
}

// anew computes a state from its inputs, without anything that was stored.
func (s *Stage) anew(ctx context.Context, snap *study.Snapshot, store study.Store, told func(string, int, int)) (*run.Results, error) {
	e := &run.Engine{Params: s.c.Parts.Params, Progress: told, Load: run.StoreLoader(store)}
	return e.Compute(ctx, snap)
}

// stopped tells whether the user stopped it.
func stopped(err error) bool { return errors.Is(err, context.Canceled) }

// progressLine shows how far something is and lets the user stop it.
type progressLine struct {
	box  *fyne.Container
	what *widgets.Line
	bar  *widget.ProgressBar
	stop *widget.Button

	words  string
	cancel func()
}

func newProgressLine() *progressLine {
	p := &progressLine{what: widgets.Faint(""), bar: widget.NewProgressBar()}
	p.stop = widget.NewButton("Stop", func() {
		if p.cancel != nil {
			p.cancel()
		}
	})
	p.bar.TextFormatter = func() string { return "" }
	p.box = container.NewVBox(p.what, container.NewBorder(nil, nil, nil, p.stop, p.bar))
	p.box.Hide()
	return p
}

func (p *progressLine) begin(words string, cancel func()) {
	p.words, p.cancel = words, cancel
	p.what.Set(words)
	p.bar.SetValue(0)
	p.box.Show()
}

func (p *progressLine) show(what string, done, total int) {
	if total > 0 {
		p.bar.SetValue(float64(done) / float64(total))
		p.what.Set(fmt.Sprintf("%s: %s, %s of %s", p.words, what, core.Count(done), core.Count(total)))
		return
	}
	p.what.Set(p.words + ": " + what)
}

func (p *progressLine) end() {
	p.cancel = nil
	p.box.Hide()
}

// short writes a check code as people compare it.
func short(code string) string { return code[:min(12, len(code))] }

// padded gives a pane room at its top.
func padded(o fyne.CanvasObject) fyne.CanvasObject {
	return container.New(layout.NewCustomPaddedLayout(6, 0, 0, 0), o)
}

// gap is a calm distance between parts.
func gap(height float32) fyne.CanvasObject {
	return container.New(layout.NewCustomPaddedLayout(height, 0, 0, 0))
}

func visible(o fyne.CanvasObject, yes bool) {
	if o.Visible() == yes {
		return
	}
	if yes {
		o.Show()
	} else {
		o.Hide()
	}
}

func able(b *widget.Button, yes bool) {
	if yes {
		b.Enable()
	} else {
		b.Disable()
	}
}
