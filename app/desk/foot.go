package desk

import (
	"fmt"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
)

// foot is the line below everything: what is under way with its progress, and a short word on what was
// done.
type foot struct {
	w       *Window
	words   *widgets.Line
	bar     *widget.ProgressBar
	stop    *widget.Button
	resume  *widget.Button
	working *fyne.Container
	all     fyne.CanvasObject
	round   int
}

func newFoot(w *Window) *foot {
	f := &foot{w: w, words: widgets.Faint("")}
	f.bar = widget.NewProgressBar()
	f.bar.TextFormatter = func() string { return "" }
	f.stop = widget.NewButton("Stop", func() { w.core.Session.StopComputing() })
	f.resume = widget.NewButton("Compute", func() { w.core.Session.Compute() })
	f.stop.Importance, f.resume.Importance = widget.LowImportance, widget.LowImportance
	f.working = container.New(layout.NewCustomPaddedHBoxLayout(6), container.NewGridWrap(fyne.NewSize(220, 14), f.bar), f.stop)
	row := container.NewBorder(nil, nil, nil, container.NewHBox(container.NewCenter(f.working), f.resume), f.words)
	f.all = container.NewVBox(widget.NewSeparator(), container.New(layout.NewCustomPaddedLayout(0, 0, 12, 8), container.NewStack(container.NewGridWrap(fyne.NewSize(1, f.stop.MinSize().Height)), row)))
	return f
}

// tell shows a short word for a while.
func (f *foot) tell(words string) {
	f.round++
	round := f.round
	f.words.Set(words)
	time.AfterFunc(6*time.Second, func() {
		f.w.do(func() {
			if f.round == round {
				f.round = 0
				f.update()
			}
		})
	})
}

func (f *foot) update() {
	c := f.w.core
	if c == nil || c.Session == nil || c.View() == nil {
		return
	}
	v := c.View()
	work, busy := c.Session.Work()
	show(f.working, busy)
	show(f.resume, !busy && (v.Stopped || v.Problem != nil))
	if busy {
		if work.Total > 0 {
			f.bar.SetValue(float64(work.Done) / float64(work.Total))
		} else {
			f.bar.SetValue(0)
		}
	}
	if f.round != 0 {
		return
	}
	words := "Up to date."
	switch {
	case busy && work.What == "voices":
		words = "Putting the candidates in order. You can go on working."
	case busy && work.What == "kept sites":
		words = fmt.Sprintf("Reading what is kept: %s of %s sites. You can go on working.", core.Count(work.Done), core.Count(work.Total))
	case busy && work.Total > 0:
		words = fmt.Sprintf("Computing: %s of %s sites", core.Count(work.Done), core.Count(work.Total))
		if work.LeftKnown {
			words += ", about " + left(work.Left) + " left"
		}
		words += ". You can go on working."
	case busy:
		words = "Getting ready: layers, rules, plant options. You can go on working."
	case v.Problem != nil:
		words = "Not computed: " + present.Problem(v.Problem)
	case v.Stopped:
		words = "Stopped. What was found so far is kept; Compute goes on from there."
	case !v.Current:
		words = "Out of date."
	case c.Ordering():
		words = "Putting the candidates in order."
	}
	f.words.Set(words)
}

// left writes a duration as a person says it.
func left(d time.Duration) string {
	switch s := int(d.Seconds() + 0.5); {
	case s < 2:
		return "a second"
	case s < 90:
		return fmt.Sprintf("%d seconds", s)
	default:
		return fmt.Sprintf("%d minutes", (s+30)/60)
	}
}

func show(o fyne.CanvasObject, yes bool) {
	if yes {
		o.Show()
	} else {
		o.Hide()
	}
}
