package core

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/live"
	"groundtally/app/present"
)

// Fail shows what went wrong, in plain words, with the cure. Nothing is shown for no error, nor for
// something that the user stopped.
func (c *Core) Fail(what string, err error) {
	if err == nil || errors.Is(err, context.Canceled) {
		return
	}
	label := widget.NewLabel(present.Problem(err))
	label.Wrapping = fyne.TextWrapWord
	body := container.NewVBox(label)
	var fault *live.FaultError
	if errors.As(err, &fault) {
		details := widget.NewMultiLineEntry()
		details.SetText(fault.Details)
		details.SetMinRowsVisible(8)
		body.Add(widget.NewLabel("For a report of the fault:"))
		body.Add(details)
	}
	d := dialog.NewCustom(fmt.Sprintf("Could not %s", strings.TrimSuffix(what, ".")), "Close", body, c.Window)
	d.Resize(fyne.NewSize(520, 180))
	c.Open(d)
}

// confirm asks a question and does what follows when the answer is yes.
func (c *Core) confirm(title, words, yes string, then func()) {
	label := widget.NewLabel(words)
	label.Wrapping = fyne.TextWrapWord
	d := dialog.NewCustomConfirm(title, yes, "Leave it", label, func(ok bool) {
		if ok {
			then()
		}
	}, c.Window)
	d.Resize(fyne.NewSize(460, 170))
	c.Open(d)
}
