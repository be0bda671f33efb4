package weigh

import (
	"math"
	"strconv"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/scoring/criteria"
)

func plural(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return strconv.Itoa(n) + " " + what + "s"
}

// pointWords writes swing points.
func pointWords(x float64) string {
	if x > mostPoints {
		return strconv.FormatFloat(math.Round(x), 'f', 0, 64)
	}
	return strconv.FormatFloat(math.Round(x*10)/10, 'f', -1, 64)
}

// scoreWords writes a score or a part of one.
func scoreWords(x float64) string { return strconv.FormatFloat(x, 'f', 2, 64) }

func percentWords(x float64) string { return strconv.Itoa(int(math.Round(100*x))) + " %" }

// share100 writes in how many of 100 mixes something is first.
func share100(x float64) string { return strconv.FormatFloat(math.Round(x), 'f', 0, 64) }

// amount writes a number without a range with its unit.
func amount(x float64, unit string) string {
	return strings.TrimSpace(present.Figure(x, 0, 0) + " " + present.Unit(unit))
}

// scaleWords writes the span of a value scale, worst to best.
func scaleWords(k run.BoardKey) string {
	return present.Figure(k.Worst, 0, 0) + " → " + amount(k.Best, k.Info.Unit)
}

// unitPhrase says in what a consequence is given.
func unitPhrase(unit string) string {
	if unit == "1" {
		return "as a pure number"
	}
	return "in " + present.Unit(unit)
}

func betterWords(b criteria.Better) string {
	if b == criteria.Less {
		return "less of it is better"
	}
	return "more of it is better"
}

func total(xs []float64) float64 {
	t := 0.0
	for _, x := range xs {
		t += x
	}
	return t
}

// pointsAt gives the swing points at which a key has the share w of all weight while the points of the
// others stay, others their sum; ok is false when no points do.
//
//	raw = w/(1 - w) others
func pointsAt(w, others float64) (points float64, ok bool) {
	if w >= 1 || others <= 0 {
		return 0, false
	}
	return w / (1 - w) * others, true
}

// inset is a layout that leaves room around its objects.
type inset struct{ left, top, right, bottom float32 }

func (i inset) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	for _, o := range objects {
		o.Move(fyne.NewPos(i.left, i.top))
		o.Resize(fyne.NewSize(max(size.Width-i.left-i.right, 0), max(size.Height-i.top-i.bottom, 0)))
	}
}

func (i inset) MinSize(objects []fyne.CanvasObject) fyne.Size {
	size := fyne.Size{}
	for _, o := range objects {
		size = size.Max(o.MinSize())
	}
	return size.Add(fyne.NewSize(i.left+i.right, i.top+i.bottom))
}

// flush takes away the room that a label leaves at its sides, so that its text stands under headings.
func flush(l *widget.Label) fyne.CanvasObject {
	return container.New(inset{-6, -4, -6, -4}, l)
}

// free is a layout made of two functions.
type free struct {
	min   func() fyne.Size
	place func(fyne.Size)
}

func (f free) Layout(_ []fyne.CanvasObject, size fyne.Size) { f.place(size) }
func (f free) MinSize([]fyne.CanvasObject) fyne.Size        { return f.min() }

func put(o fyne.CanvasObject, x, y, width, height float32) {
	o.Move(fyne.NewPos(x, y))
	o.Resize(fyne.NewSize(max(width, 0), max(height, 0)))
}
