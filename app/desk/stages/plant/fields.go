package plant

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
)

// The toolkit does not bring what the keyboard moves to into view, so fields of a long form do it themselves.

// field is an entry that comes into view when the keyboard reaches it.
type field struct {
	widget.Entry
	reached func(fyne.CanvasObject)
}

func newField(hint string, reached func(fyne.CanvasObject)) *field {
	f := &field{reached: reached}
	f.PlaceHolder = hint
	f.ExtendBaseWidget(f)
	return f
}

// FocusGained implements fyne.Focusable.
func (f *field) FocusGained() {
	f.Entry.FocusGained()
	f.reached(f)
}

// choiceField is a choice that comes into view when the keyboard reaches it.
type choiceField struct {
	widget.Select
	reached func(fyne.CanvasObject)
}

func newChoiceField(options []string, changed func(string), reached func(fyne.CanvasObject)) *choiceField {
	f := &choiceField{reached: reached}
	f.Options, f.OnChanged, f.PlaceHolder = options, changed, "Choose one"
	f.ExtendBaseWidget(f)
	return f
}

// FocusGained implements fyne.Focusable.
func (f *choiceField) FocusGained() {
	f.Select.FocusGained()
	f.reached(f)
}

// pillField is a pill that comes into view when the keyboard reaches it.
type pillField struct {
	widgets.Pill
	reached func(fyne.CanvasObject)
}

func newPillField(text string, tapped func(), reached func(fyne.CanvasObject)) *pillField {
	f := &pillField{reached: reached}
	f.Text, f.OnTapped = text, tapped
	f.ExtendBaseWidget(f)
	return f
}

// FocusGained implements fyne.Focusable.
func (f *pillField) FocusGained() {
	f.Pill.FocusGained()
	f.reached(f)
}

// reveal scrolls something into view, with a little room around it.
func reveal(in *container.Scroll, o fyne.CanvasObject) {
	const room = 40
	d := fyne.CurrentApp().Driver()
	top := d.AbsolutePositionForObject(o).Y - d.AbsolutePositionForObject(in).Y
	bottom := top + o.Size().Height
	at := in.Offset
	switch {
	case top < 0:
		at.Y += top - room
	case bottom > in.Size().Height:
		at.Y += bottom - in.Size().Height + room
	default:
		return
	}
	in.ScrollToOffset(at)
}

// reached brings a field of the form that is shown into view.
func (s *stage) reached(o fyne.CanvasObject) {
	switch s.tabs.Chosen() {
	case tabSizes:
		reveal(s.settings.body, o)
	case tabRules:
		reveal(s.rules.body, o)
	}
}
