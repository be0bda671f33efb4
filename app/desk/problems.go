package desk

import (
	"image/color"
	"slices"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/appendix"
	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
	"groundtally/app/present"
	"groundtally/geo"
)

// problem is one line of the problem list.
type problem struct {
	words string
	grade string
	warm  bool
	at    *geo.LonLat
	stage string // where it is mended
	layer string
}

// problems lists everything that wants a look, the gravest first.
func (w *Window) problems() []problem {
	v := w.core.View()
	if v == nil {
		return nil
	}
	var out []problem
	if v.Problem != nil {
		out = append(out, problem{words: present.Problem(v.Problem), grade: "not computed", warm: true, stage: "Ground"})
	}
	notices := slices.Clone(v.Notices)
	slices.SortStableFunc(notices, func(a, b geo.Notice) int { return int(b.Severity) - int(a.Severity) })
	for _, n := range notices {
		p := problem{words: present.Notice(n), grade: grade(n.Severity), warm: n.Severity == geo.Fault, at: n.At, layer: n.Layer, stage: "Ground"}
		switch n.Code {
		case "legal_not_set", "no_plants":
			p.stage = "Plant"
		case "voice_unusable", "family_twice", "return_scale":
			p.stage = "Weigh"
		}
		out = append(out, p)
	}
	return out
}

func grade(s geo.Severity) string {
	switch s {
	case geo.Fault:
		return "keeps something back"
	case geo.Warning:
		return "look at it"
	}
	return "to know"
}

// measured is how many entries get rows of their own height; more would keep the window from answering.
const measured = 2000

// showProblems opens the one list of everything that wants a look.
func (w *Window) showProblems() {
	list := w.problems()
	if len(list) == 0 {
		dialog.ShowInformation("Problems", "There is nothing to look at.", w.window)
		return
	}
	var d dialog.Dialog
	const gradeWide, buttonWide, wordsWide = 140, 150, 540
	l := widget.NewList(func() int { return len(list) }, func() fyne.CanvasObject {
		words := widget.NewLabel("")
		words.Wrapping = fyne.TextWrapWord
		b := widget.NewButton("", nil)
		b.Importance = widget.LowImportance
		grade := container.NewVBox(place(gradeWide, 3), widgets.Faint(""))
		return container.NewBorder(nil, nil, grade, container.NewVBox(container.NewGridWrap(fyne.NewSize(buttonWide, 28), b)), words)
	}, func(i widget.ListItemID, o fyne.CanvasObject) {
		p := list[i]
		box := o.(*fyne.Container)
		words := box.Objects[0].(*widget.Label)
		g := box.Objects[1].(*fyne.Container).Objects[1].(*widgets.Line)
		b := box.Objects[2].(*fyne.Container).Objects[0].(*fyne.Container).Objects[0].(*widget.Button)
		colour := theme.Faint
		if p.warm {
			colour = theme.Warm
		}
		g.SetLook(p.grade, colour, p.warm)
		words.SetText(p.words)
		if p.at != nil {
			b.SetText("Show on the map")
			b.OnTapped = func() { d.Hide(); w.core.ShowPlace(*p.at) }
			return
		}
		b.SetText("Go to " + p.stage)
		b.OnTapped = func() { d.Hide(); w.core.ShowStage(p.stage) }
	})
	for i := range min(len(list), measured) { // rows are as high as their words need
		lines := len(draw.Lines(list[i].words, 13, false, wordsWide, 20))
		l.SetItemHeight(i, float32(16+18*max(lines, 1)))
	}
	title := widgets.Faint(core.Count(len(list)) + " entries. Each says where, what, and what the program did or what you can do.")
	d = dialog.NewCustom("Problems", "Close", container.NewBorder(title, nil, nil, nil, l), w.window)
	d.Resize(fyne.NewSize(900, 520))
	w.core.Open(d)
}

// place is something unseen that keeps room.
func place(width, height float32) fyne.CanvasObject {
	r := canvas.NewRectangle(color.Transparent)
	r.SetMinSize(fyne.NewSize(width, height))
	return r
}

// showCautions shows the cautions of the appendix.
func (w *Window) showCautions() {
	box := container.New(layout.NewCustomPaddedVBoxLayout(2))
	for _, c := range appendix.Cautions() {
		box.Add(widgets.NewText(c))
	}
	d := dialog.NewCustom("Cautions", "Close", container.NewVScroll(box), w.window)
	d.Resize(fyne.NewSize(640, 420))
	w.core.Open(d)
}
