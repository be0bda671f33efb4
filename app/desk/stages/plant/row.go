package plant

import (
	"errors"
	"image/color"
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/container"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

// choice is a value of a setting with its words.
type choice struct{ value, words string }

// row is one setting with its value, unit, meaning and origin. What a person types stays until it is
// taken or given up; a value that cannot be is refused beside the field.
type row struct {
	s       *stage
	key     string // under which a change is written
	label   string
	def     study.Definition
	take    string // word on the button that gives an own value up
	choices []choice
	held    inForce
	sent    *study.Setting // what was in force when a change was handed over; nil when none is under way
	setting bool           // the program sets the field

	keeps    bool   // the own value cannot be given up
	optional bool   // a value that is not set is merely no limit
	more     string // said after what the setting is

	all           *fyne.Container
	title, unit   *widgets.Line
	entry         *field
	pick          *choiceField
	source, why   *field
	edit          *fyne.Container
	origin, fault *widget.Label
	mark          *widgets.Line // what wants attention; hidden when nothing does
	back          *pillField
}

// newRow makes the row of a setting. Choices, if there are any, take the place of the field.
func newRow(s *stage, key, label, take string, choices []choice) *row {
	r := &row{s: s, key: key, label: label, take: take, choices: choices}
	r.def, _ = s.core.Parts.Catalog.Definition(key)
	r.title, r.unit = widgets.NewLine(label), widgets.Faint("")
	r.title.Bold = true
	r.title.Hint = r.def.What
	r.source, r.why = newField("source", s.reached), newField("why", s.reached)
	r.source.OnSubmitted = func(string) { r.commit() }
	r.why.OnSubmitted = r.source.OnSubmitted
	set := widget.NewButton("Set", r.commit)
	set.Importance = widget.HighImportance
	r.edit = widgets.Fields(6, []float32{0, 0, 46, 66}, r.source, r.why, set, widget.NewButton("Give up", r.giveUp))
	r.origin, r.fault, r.mark = caption(""), caption(""), widgets.Warm("")
	r.fault.Importance = widget.WarningImportance
	r.back = newPillField(take, r.giveBack, s.reached)
	var input fyne.CanvasObject
	width := float32(104)
	if choices != nil {
		words := make([]string, len(choices))
		for i, c := range choices {
			words[i] = c.words
		}
		r.pick = newChoiceField(words, func(string) { r.typed() }, s.reached)
		input, width = r.pick, 218
	} else {
		r.entry = newField("", s.reached)
		r.entry.OnChanged = func(string) { r.typed() }
		r.entry.OnSubmitted = func(string) { r.commit() }
		input = r.entry
		if r.def.Kind == "text" {
			width = 218
		}
	}
	head := widgets.Fields(8, []float32{0, width, 106}, r.title, input, r.unit)
	if width > 200 {
		head = widgets.Fields(8, []float32{0, width}, r.title, input)
	}
	r.all = container.NewVBox(head, r.edit, r.fault, r.mark, container.New(beside{}, flush(r.origin), r.back), space(8))
	r.edit.Hide()
	r.fault.Hide()
	r.mark.Hide()
	r.back.Hide()
	return r
}

// caption is small text that wraps.
func caption(text string) *widget.Label {
	l := widgets.NewText(text)
	l.SizeName = toolkit.SizeNameCaptionText
	return l
}

// flush sets a wrapping text flush with the lines above it, closer to them than it would stand.
func flush(o fyne.CanvasObject) fyne.CanvasObject { return container.New(insets{-6, -6, -6, -4}, o) }

// insets keeps room around an object: left, top, right, bottom.
type insets [4]float32

func (i insets) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	for _, o := range objects {
		o.Move(fyne.NewPos(i[0], i[1]))
		o.Resize(size.SubtractWidthHeight(i[0]+i[2], i[1]+i[3]))
	}
}

func (i insets) MinSize(objects []fyne.CanvasObject) fyne.Size {
	var out fyne.Size
	for _, o := range objects {
		out = out.Max(o.MinSize())
	}
	return out.AddWidthHeight(i[0]+i[2], i[1]+i[3])
}

func space(height float32) fyne.CanvasObject {
	r := canvas.NewRectangle(color.Transparent)
	r.SetMinSize(fyne.NewSize(1, height))
	return r
}

// text gives what stands in the field.
func (r *row) text() string {
	if r.pick != nil {
		if i := r.pick.SelectedIndex(); i >= 0 {
			return r.choices[i].value
		}
		return ""
	}
	text := strings.TrimSpace(r.entry.Text)
	if r.def.Kind == "number" { // a comma for a point, as many write it
		text = strings.ReplaceAll(strings.ReplaceAll(text, " ", ""), ",", ".")
	}
	return text
}

// now is what the field shows while nothing is typed.
func (r *row) now() string {
	if !r.held.ok || r.held.notSet() && r.pick == nil {
		return ""
	}
	return r.held.value.Value
}

func (r *row) dirty() bool { return r.text() != r.now() }

func (r *row) typed() {
	if r.setting {
		return
	}
	visible(r.edit, r.dirty())
	r.refuse(nil)
	r.s.grown()
}

func (r *row) put(text string) {
	r.setting = true
	defer func() { r.setting = false }()
	if r.pick != nil {
		at := slices.IndexFunc(r.choices, func(c choice) bool { return c.value == text })
		switch {
		case at == r.pick.SelectedIndex():
		case at < 0:
			r.pick.ClearSelected()
		default:
			r.pick.SetSelectedIndex(at)
		}
		return
	}
	if r.entry.Text != text {
		r.entry.SetText(text)
	}
}

// update shows what is in force; it tells whether the row may have another height now.
func (r *row) update(held inForce) (moved bool) {
	before := [3]bool{r.edit.Visible(), r.fault.Visible(), r.back.Visible()}
	dirty := r.dirty()
	if r.sent != nil && *r.sent != held.value {
		dirty, r.sent = false, nil
	}
	r.held = held
	if !dirty {
		r.put(r.now())
		r.empty()
		r.refuse(nil)
	}
	if dirty = r.dirty(); r.edit.Visible() != dirty {
		visible(r.edit, dirty)
	}
	unit := unitWords(r.def.Unit, r.now())
	if strings.HasSuffix(r.key, ".fit_machines") {
		unit = "machines"
	} else if r.def.Kind == "number" && unit == "" {
		unit = present.UnitWords(r.def.Unit)
	}
	switch {
	case r.def.Kind != "number":
		r.unit.SetLook("", theme.Faint, false)
	case held.notSet() && r.optional:
		r.unit.SetLook("no limit ("+unit+")", theme.Faint, false)
	case held.notSet():
		r.unit.SetLook("not set ("+unit+")", theme.Warm, true)
	default:
		r.unit.SetLook(unit, theme.Faint, false)
	}
	if text := r.s.origin(r); r.origin.Text != text {
		r.origin.SetText(text)
		moved = true
	}
	visible(r.back, held.ok && held.byUser && !r.keeps)
	return moved || before != [3]bool{r.edit.Visible(), r.fault.Visible(), r.back.Visible()}
}

// warn says what wants attention; an empty text takes it away. It tells whether the row's height changed.
func (r *row) warn(text string) (moved bool) {
	moved = (text != "") != r.mark.Visible()
	r.mark.Set(text)
	visible(r.mark, text != "")
	return moved
}

func visible(o fyne.CanvasObject, yes bool) {
	switch {
	case yes == o.Visible():
	case yes:
		o.Show()
	default:
		o.Hide()
	}
}

// refuse says beside the field why a value cannot be; nil takes it away.
func (r *row) refuse(err error) {
	text := ""
	if err != nil {
		text = refusal(err)
	}
	if r.fault.Text != text {
		r.fault.SetText(text)
	}
	visible(r.fault, text != "")
}

// refusal writes why a setting cannot have a value, without the name of the setting, which stands beside it.
func refusal(err error) string {
	var bad *study.ValueError
	if errors.As(err, &bad) {
		err = bad.Err
	}
	return present.Problem(err)
}

// commit takes what was typed over as one edit.
func (r *row) commit() {
	if !r.dirty() {
		return
	}
	text := r.text()
	if text == "" {
		r.refuse(errors.New("enter a value, or give up"))
		r.s.grown()
		return
	}
	if err := run.CheckSetting(r.s.core.Parts.Catalog, r.s.core.Parts.Params, r.key, text, r.s.core.View().Snap.Turbines()...); err != nil {
		r.refuse(err)
		r.s.grown()
		return
	}
	was := r.held.value
	r.sent = &was
	why := strings.TrimSpace(r.why.Text)
	r.s.core.Set("change "+strings.ToLower(r.label), why, study.SettingEdit{Key: r.key, Value: text, Source: strings.TrimSpace(r.source.Text), Reason: why})
}

func (r *row) empty() {
	for _, e := range []*field{r.source, r.why} {
		if e.Text != "" {
			e.SetText("")
		}
	}
}

func (r *row) giveUp() {
	r.put(r.now())
	r.empty()
	r.typed()
	visible(r.edit, false)
	r.s.grown()
}

// giveBack empties the own value that is in force, so that what stood behind it holds again.
func (r *row) giveBack() {
	if !r.held.ok || !r.held.byUser {
		return
	}
	key, was := r.held.key, r.held.value
	do := func() {
		r.sent = &was
		r.s.core.Set("take "+strings.ToLower(r.label)+" out", "", study.SettingEdit{Key: key})
	}
	if key == r.key {
		do()
		return
	}
	r.s.core.Ask("Take the rule out for others too?", r.label+": this value was entered for "+generalName(key)+" and goes out for all of them. To change it for this option alone, type another value.", "Take out", do)
}

// beside lays a text that wraps out beside a button, which keeps its width at the right.
type beside struct{}

func (beside) Layout(objects []fyne.CanvasObject, size fyne.Size) {
	text, button := objects[0], objects[1]
	width := size.Width
	if button.Visible() {
		least := button.MinSize()
		width -= least.Width + 12
		button.Resize(least)
		button.Move(fyne.NewPos(size.Width-least.Width, 0))
	}
	text.Move(fyne.NewPos(0, 0))
	text.Resize(fyne.NewSize(width, size.Height))
}

func (beside) MinSize(objects []fyne.CanvasObject) fyne.Size {
	out := objects[0].MinSize()
	if b := objects[1]; b.Visible() {
		out.Width += b.MinSize().Width + 12
		out.Height = max(out.Height, b.MinSize().Height)
	}
	return out
}
