package desk

import (
	"image/color"
	"strings"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	toolkit "fyne.io/fyne/v2/theme"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/draw"
)

// bubble shows a sentence beside the pointer, over everything else, without taking part in the mouse.
type bubble struct {
	layer  *fyne.Container
	ground *canvas.Rectangle
	lines  []*canvas.Text
	wait   *time.Timer
	gone   *time.Timer
	owner  fyne.CanvasObject
	words  string
	round  int
	do     func(func())
}

const (
	bubbleSize  = 12
	bubbleWidth = 340
	bubbleWait  = 350 * time.Millisecond
	bubbleStay  = 8 * time.Second // what scrolled away under the pointer tells nobody that it left
)

func newBubble(do func(func())) *bubble {
	b := &bubble{ground: canvas.NewRectangle(color.Transparent), do: do}
	b.layer = &fyne.Container{Layout: keepPlace{}, Objects: []fyne.CanvasObject{b.ground}}
	b.ground.Hide()
	return b
}

// keepPlace leaves objects where they are, and asks for no room.
type keepPlace struct{}

func (keepPlace) Layout([]fyne.CanvasObject, fyne.Size) {}
func (keepPlace) MinSize([]fyne.CanvasObject) fyne.Size { return fyne.Size{} }

// explain shows words after the pointer rested for a moment; an empty text hides what is shown.
func (b *bubble) explain(owner fyne.CanvasObject, words string, at fyne.Position) {
	if owner == b.owner && words == b.words {
		return
	}
	b.owner, b.words = owner, words
	b.round++
	if b.wait != nil {
		b.wait.Stop()
		b.gone.Stop()
	}
	b.hide()
	if words == "" {
		return
	}
	round := b.round
	b.wait = time.AfterFunc(bubbleWait, func() {
		b.do(func() {
			if round == b.round {
				b.show(words, at)
			}
		})
	})
	b.gone = time.AfterFunc(bubbleStay, func() {
		b.do(func() {
			if round == b.round {
				b.hide()
			}
		})
	})
}

func (b *bubble) hide() {
	if !b.ground.Visible() {
		return
	}
	b.ground.Hide()
	for _, l := range b.lines {
		l.Hide()
	}
	b.layer.Refresh()
}

func (b *bubble) show(words string, at fyne.Position) {
	lines := wrap(words, bubbleWidth)
	wide := 0.0
	for _, l := range lines {
		wide = max(wide, draw.TextWidth(l, bubbleSize, false))
	}
	const pad, step = 9, 17
	size := fyne.NewSize(float32(wide)+2*pad+2, float32(len(lines))*step+2*pad-3)
	room := b.layer.Size()
	pos := fyne.NewPos(at.X+14, at.Y+18)
	pos.X = max(4, min(pos.X, room.Width-size.Width-4))
	if pos.Y+size.Height > room.Height-4 {
		pos.Y = max(4, at.Y-size.Height-10)
	}
	b.ground.FillColor, b.ground.StrokeColor, b.ground.StrokeWidth, b.ground.CornerRadius = widgets.Colour(toolkit.ColorNameInputBackground), widgets.Colour(theme.Rule), 1, 5
	b.ground.Move(pos)
	b.ground.Resize(size)
	b.ground.Show()
	for len(b.lines) < len(lines) {
		t := canvas.NewText("", color.Black)
		t.TextSize = bubbleSize
		b.lines = append(b.lines, t)
		b.layer.Objects = append(b.layer.Objects, t)
	}
	for i, t := range b.lines {
		if i >= len(lines) {
			t.Hide()
			continue
		}
		t.Text, t.Color = lines[i], widgets.Colour(toolkit.ColorNameForeground)
		t.Move(fyne.NewPos(pos.X+pad, pos.Y+pad-2+float32(i)*step))
		t.Resize(fyne.NewSize(size.Width-pad, step))
		t.Show()
		t.Refresh()
	}
	b.ground.Refresh()
	b.layer.Refresh()
}

// wrap breaks words into lines.
func wrap(words string, width float64) []string {
	var out []string
	for _, part := range strings.Split(words, "\n") {
		line := ""
		for _, w := range strings.Fields(part) {
			if next := strings.TrimSpace(line + " " + w); line == "" || draw.TextWidth(next, bubbleSize, false) <= width {
				line = next
				continue
			}
			out = append(out, line)
			line = w
		}
		out = append(out, draw.Fit(line, bubbleSize, false, width+40))
	}
	return out
}
