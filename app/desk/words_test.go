package desk

import (
	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/widgets"
)

// wordsOf gives the text that an object shows.
func wordsOf(o fyne.CanvasObject) string {
	switch x := o.(type) {
	case *widget.Label:
		return x.Text
	case *widget.Button:
		return x.Text
	case *canvas.Text:
		return x.Text
	case *widgets.Line:
		return x.Text
	}
	return ""
}
