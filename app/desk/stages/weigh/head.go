package weigh

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"unicode"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/layout"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/run"
	"groundtally/app/study"
)

// head is the top of the stage: the voice, and whether its weights are saved.
type head struct {
	s           *stage
	choice      *widget.Select
	names       []string // of the voices, as they stand in the choice
	state       *widgets.Line
	keep, back  *widget.Button
	add, rename *widget.Button
	top, box    *fyne.Container
}

func newHead(s *stage) *head {
	h := &head{s: s, state: widgets.Faint("").Wide()}
	h.choice = widget.NewSelect(nil, func(string) {
		if i := h.choice.SelectedIndex(); i >= 0 && i < len(h.names) {
			s.c.SetVoice(h.names[i])
		}
	})
	h.choice.PlaceHolder = "no voice yet"
	// A pressed button gives up the keyboard, so it is handed on within the pane.
	then := func(do func()) func() {
		return func() {
			do()
			s.c.Window.Canvas().Focus(h.choice)
		}
	}
	h.keep = widget.NewButton("Save weights", then(s.save))
	h.keep.Importance = widget.HighImportance
	h.back = widget.NewButton("Back to saved", then(s.back))
	h.add = widget.NewButton("New voice…", h.askNew)
	h.rename = widget.NewButton("Rename…", h.askTitle)
	h.top = container.NewHBox(widgets.Heading("Weigh").Wide(), layout.NewSpacer(), h.state, h.keep, h.back)
	height := h.keep.MinSize().Height
	row := container.NewBorder(nil, nil, widgets.Faint("Voice").Hinted("One group's weights and value scales: residents, farmers, the network operator.").Wide(), container.NewHBox(h.add, h.rename), h.choice)
	h.box = container.NewVBox(container.New(free{
		min:   func() fyne.Size { return fyne.NewSize(h.top.MinSize().Width, height) }, // the same with and without the buttons
		place: func(size fyne.Size) { put(h.top, 0, 0, size.Width, size.Height) },
	}, h.top), row)
	return h
}

func (h *head) object() fyne.CanvasObject { return h.box }

func (h *head) update() {
	c := h.s.c
	v := c.View()
	if v == nil {
		return
	}
	names := v.Snap.Voices()
	titles := make([]string, len(names))
	for i, n := range names {
		titles[i] = c.VoiceTitle(n)
		if slices.Index(titles[:i], titles[i]) >= 0 {
			titles[i] += " (" + n + ")"
		}
	}
	at := slices.Index(names, c.Voice())
	if !slices.Equal(h.names, names) || !slices.Equal(h.choice.Options, titles) || h.choice.SelectedIndex() != at {
		h.names, h.choice.Options = names, titles
		h.choice.Selected = ""
		if at >= 0 {
			h.choice.Selected = titles[at]
		}
		h.choice.Refresh()
	}
	trying, was := c.Trying(), h.state.Text
	switch {
	case at < 0:
		h.state.SetLook("", theme.Faint, false)
	case trying && total(c.Raw()) == 0:
		h.state.SetLook("give something a weight", theme.Warm, false)
	case trying:
		h.state.SetLook("being tried out", theme.Warm, false)
	default:
		h.state.SetLook("saved", theme.Faint, false)
	}
	show(h.keep, trying)
	show(h.back, trying)
	if was != h.state.Text {
		h.top.Refresh() // what is there, and how wide it is, has changed
	}
	enable(h.rename, at >= 0)
}

func show(o fyne.CanvasObject, yes bool) {
	switch {
	case yes && !o.Visible():
		o.Show()
	case !yes && o.Visible():
		o.Hide()
	}
}

func enable(b *widget.Button, yes bool) {
	switch {
	case yes && b.Disabled():
		b.Enable()
	case !yes && !b.Disabled():
		b.Disable()
	}
}

// shortName makes the name of a voice from its title: what settings are kept under.
func shortName(title string) string {
	var b strings.Builder
	for _, r := range strings.ToLower(strings.TrimSpace(title)) {
		switch {
		case unicode.IsLetter(r) || unicode.IsDigit(r):
			b.WriteRune(r)
		case b.Len() > 0 && !strings.HasSuffix(b.String(), "_"):
			b.WriteByte('_')
		}
	}
	return strings.TrimSuffix(b.String(), "_")
}

// newVoice gives the edits that make a voice, with the weights of another one.
func newVoice(snap *study.Snapshot, name, title, from string) []study.SettingEdit {
	edits := []study.SettingEdit{{Key: "voice." + name + ".title", Value: title, Reason: "set in the window"}}
	prefix := "voice." + from + ".weight."
	for key, set := range snap.Explicit {
		if k, ok := strings.CutPrefix(key, prefix); ok && from != "" {
			edits = append(edits, study.SettingEdit{Key: "voice." + name + ".weight." + k, Value: set.Value, Reason: "as for " + from})
		}
	}
	slices.SortFunc(edits, func(a, b study.SettingEdit) int { return strings.Compare(a.Key, b.Key) })
	return edits
}

func (h *head) askNew() {
	title, name := widget.NewEntry(), widget.NewEntry()
	title.SetPlaceHolder("Bird protection society")
	own := false // the user typed a name of their own
	title.OnChanged = func(t string) {
		if !own {
			name.SetText(shortName(t))
			own = false
		}
	}
	name.OnChanged = func(n string) { own = n != shortName(title.Text) }
	title.Validator = func(t string) error {
		if strings.TrimSpace(t) == "" {
			return errors.New("give it a title")
		}
		return nil
	}
	name.Validator = func(n string) error {
		switch {
		case n == "":
			return errors.New("give it a name")
		case slices.Contains(h.s.c.View().Snap.Voices(), n):
			return errors.New("there is a voice of this name")
		case strings.ContainsFunc(n, func(r rune) bool { return !unicode.IsLetter(r) && !unicode.IsDigit(r) && r != '_' && r != '-' }):
			return errors.New("letters, digits, _ and - only")
		}
		return nil
	}
	from := h.s.c.Voice()
	items := []*widget.FormItem{widget.NewFormItem("Title", title), widget.NewFormItem("Name", name)}
	items[1].HintText = "used in files and at the terminal"
	if from != "" {
		items[0].HintText = "begins with the weights of " + h.s.c.VoiceTitle(from)
	}
	d := dialog.NewForm("New voice", "Add voice", "Cancel", items, func(ok bool) {
		if ok {
			h.addVoice(name.Text, strings.TrimSpace(title.Text), from)
		}
	}, h.s.c.Window)
	d.Resize(fyne.NewSize(420, 230))
	d.Show()
	h.s.c.Window.Canvas().Focus(title)
}

func (h *head) addVoice(name, title, from string) {
	c := h.s.c
	edits := newVoice(c.View().Snap, name, title, from)
	for _, e := range edits {
		if err := run.CheckSetting(c.Parts.Catalog, c.Parts.Params, e.Key, e.Value); err != nil {
			c.Fail("add the voice", err)
			return
		}
	}
	c.Edit("add the voice", func(ctx context.Context, s *study.Study) error {
		_, err := s.Set(ctx, "set", "new voice "+title, edits...)
		return err
	}, func() {
		c.SetVoice(name)
		c.Tell(fmt.Sprintf("The voice %q was added.", title))
	})
}

func (h *head) askTitle() {
	c := h.s.c
	voice := c.Voice()
	title := widget.NewEntry()
	title.SetText(c.VoiceTitle(voice))
	title.Validator = func(t string) error {
		if strings.TrimSpace(t) == "" {
			return errors.New("give it a title")
		}
		return nil
	}
	item := widget.NewFormItem("Title", title)
	item.HintText = "its name in files stays " + voice
	d := dialog.NewForm("Rename the voice", "Rename", "Cancel", []*widget.FormItem{item}, func(ok bool) {
		if ok {
			c.Set("rename the voice", "renamed in the window", study.SettingEdit{Key: "voice." + voice + ".title", Value: strings.TrimSpace(title.Text), Reason: "renamed in the window"})
		}
	}, c.Window)
	d.Resize(fyne.NewSize(400, 170))
	d.Show()
	c.Window.Canvas().Focus(title)
}
