package widgets

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/widget"
)

// EnterButton is a button that Return presses too, as space does.
type EnterButton struct {
	widget.Button
}

// NewEnterButton makes a button with its words at the left.
func NewEnterButton(words string, icon fyne.Resource, do func()) *EnterButton {
	b := &EnterButton{}
	b.Text, b.Icon, b.OnTapped, b.Alignment = words, icon, do, widget.ButtonAlignLeading
	b.ExtendBaseWidget(b)
	return b
}

// TypedKey implements fyne.Focusable.
func (b *EnterButton) TypedKey(e *fyne.KeyEvent) {
	if e.Name == fyne.KeyReturn || e.Name == fyne.KeyEnter {
		b.Tapped(nil)
		return
	}
	b.Button.TypedKey(e)
}
