package widgets

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
)

// Fields puts objects side by side. A width above zero holds; objects of width zero share what is left.
// Everything stands in the middle of the row's height.
func Fields(gap float32, widths []float32, objects ...fyne.CanvasObject) *fyne.Container {
	return container.New(&fields{gap: gap, widths: widths}, objects...)
}

type fields struct {
	gap    float32
	widths []float32
}

func (f *fields) width(i int, o fyne.CanvasObject) (w float32, shares bool) {
	if i < len(f.widths) && f.widths[i] > 0 {
		return f.widths[i], false
	}
	return o.MinSize().Width, true
}

func (f *fields) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	left, sharing, shown := size.Width, 0, 0
	for i, o := range objects {
		if !o.Visible() {
			continue
		}
		shown++
		if w, shares := f.width(i, o); shares {
			sharing++
		} else {
			left -= w
		}
	}
	left -= f.gap * float32(max(shown-1, 0))
	x := float32(0)
	for i, o := range objects {
		if !o.Visible() {
			continue
		}
		w, shares := f.width(i, o)
		if shares {
			w = max(left/float32(sharing), 0)
		}
		h := min(o.MinSize().Height, size.Height)
		o.Move(fyne.NewPos(x, (size.Height-h)/2))
		o.Resize(fyne.NewSize(w, h))
		x += w + f.gap
	}
}

func (f *fields) MinSize(objects []fyne.CanvasObject) fyne.Size {
	var out fyne.Size
	shown := 0
	for i, o := range objects {
		if !o.Visible() {
			continue
		}
		shown++
		w, _ := f.width(i, o)
		out.Width += w
		out.Height = max(out.Height, o.MinSize().Height)
	}
	out.Width += f.gap * float32(max(shown-1, 0))
	return out
}
