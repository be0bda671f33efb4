package desk

import (
	"slices"
	"strings"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
)

// bar is the head of the window: the study, the voice, the search, undo and redo, when it was saved.
type bar struct {
	w          *Window
	name, size *widgets.Line
	voice      *widget.Select
	voices     []string // names behind the titles of voice
	find       *widget.Entry
	undo, redo *widget.Button
	saved      *widgets.Line
	shown      *live.View // that the bar tells of
	voiceShown string
	left       *fyne.Container
	right      *fyne.Container
	all        fyne.CanvasObject
}

func newBar(w *Window) *bar {
	b := &bar{w: w, name: widgets.Heading("").Wide(), size: widgets.Faint("").Wide(), saved: widgets.Faint("").Wide()}
	b.name.TextSize = 16
	b.saved.Hint = "Every change is saved as it is made, in one file."
	b.voice = widget.NewSelect(nil, nil)
	b.voice.PlaceHolder = "No voice yet"
	b.find = widget.NewEntry()
	b.find.SetPlaceHolder("Find parcel or site")
	b.find.OnSubmitted = b.search
	b.undo = widget.NewButtonWithIcon("", toolkit.ContentUndoIcon(), w.undo)
	b.redo = widget.NewButtonWithIcon("", toolkit.ContentRedoIcon(), w.redo)
	b.undo.Importance, b.redo.Importance = widget.LowImportance, widget.LowImportance
	files := widget.NewButtonWithIcon("", toolkit.MenuIcon(), nil)
	files.Importance = widget.LowImportance
	files.OnTapped = func() {
		menu := fyne.NewMenu("", fyne.NewMenuItem("Open a study…", w.chooseFile), fyne.NewMenuItem("Make a new study…", w.chooseNew),
			fyne.NewMenuItem("Open the sample study", func() { w.Sample(SamplePath()) }), fyne.NewMenuItemSeparator(), fyne.NewMenuItem("Keys…", w.showKeys), fyne.NewMenuItem("Cautions…", w.showCautions))
		at := fyne.CurrentApp().Driver().AbsolutePositionForObject(files)
		widget.ShowPopUpMenuAtPosition(menu, w.window.Canvas(), at.AddXY(0, files.Size().Height))
	}
	left := container.New(layout.NewCustomPaddedHBoxLayout(12), files, container.NewCenter(b.name), container.NewCenter(b.size))
	right := container.New(layout.NewCustomPaddedHBoxLayout(8), container.NewCenter(widgets.Faint("Voice").Hinted("One group's weights and value scales. Map, order and scores follow the voice chosen here.").Wide()),
		container.NewCenter(container.NewGridWrap(fyne.NewSize(170, b.voice.MinSize().Height), b.voice)), container.NewCenter(container.NewGridWrap(fyne.NewSize(170, b.find.MinSize().Height), b.find)), b.undo, b.redo, container.NewCenter(b.saved))
	b.left, b.right = left, right
	b.all = container.NewVBox(container.New(layout.NewCustomPaddedLayout(4, 3, 8, 14), container.NewBorder(nil, nil, nil, right, container.NewHScroll(left))), widget.NewSeparator())
	return b
}

func (b *bar) update() {
	v := b.w.core.View()
	if v == nil || v == b.shown && b.w.core.Voice() == b.voiceShown {
		return
	}
	b.shown, b.voiceShown = v, b.w.core.Voice()
	name := v.Snap.Text("study.name")
	if name == "" {
		name = strings.TrimSuffix(baseName(v.Path), ".gpkg")
	}
	b.name.Set(name)
	b.name.Hint = v.Path
	b.w.window.SetTitle(name + " · Groundtally")
	parcels := 0
	for _, l := range v.Snap.LayersOf("parcels") {
		parcels += l.Count
	}
	size := core.Counted(parcels, "parcel", "parcels") + " · " + core.Counted(len(v.Snap.Plants()), "plant option", "plant options")
	if v.Index != nil {
		size += " · " + core.Counted(v.Index.Fitted, "candidate fitted", "candidates fitted")
	}
	b.size.Set(size)
	voices := v.Snap.Voices()
	titles := make([]string, len(voices))
	for i, n := range voices {
		if titles[i] = b.w.core.VoiceTitle(n); slices.Contains(titles[:i], titles[i]) {
			titles[i] += " (" + n + ")"
		}
	}
	b.voice.OnChanged = nil
	b.voices = voices
	b.voice.SetOptions(titles)
	if i := slices.Index(voices, b.w.core.Voice()); i >= 0 {
		b.voice.SetSelectedIndex(i)
	}
	b.voice.OnChanged = func(string) {
		if i := b.voice.SelectedIndex(); i >= 0 && i < len(b.voices) {
			b.w.core.SetVoice(b.voices[i])
		}
	}
	able(b.undo, v.CanUndo != "")
	able(b.redo, v.CanRedo != "")
	saved := "Saved"
	if !v.SavedAt.IsZero() {
		saved += " · " + core.Clock(v.SavedAt, b.w.clock())
	}
	colour := theme.Faint
	if b.w.locked == v.Path {
		saved, colour = "Read only: changes cannot be saved", theme.Warm
	}
	b.saved.SetLook(saved, colour, false)
	b.left.Refresh() // their texts have other widths now
	b.right.Refresh()
}

func able(b *widget.Button, yes bool) {
	if yes {
		b.Enable()
	} else {
		b.Disable()
	}
}

// search brings a parcel or a site into view and chooses its best candidate.
func (b *bar) search(text string) {
	text = strings.TrimSpace(text)
	v := b.w.core.View()
	if text == "" || v == nil || v.Index == nil {
		return
	}
	site, ok := v.Index.SiteOfParcel(text)
	if !ok {
		site, ok = v.Index.Site(text)
	}
	if !ok { // as it is written elsewhere: in other letters, or in part
		for i, s := range v.Index.Sites {
			if strings.Contains(strings.ToLower(s), strings.ToLower(text)) {
				site, ok = i, true
				break
			}
		}
	}
	if !ok {
		b.w.foot.tell("There is no parcel or site " + text)
		return
	}
	if cand := b.w.core.BestAt(site); cand != nil {
		b.w.core.Choose(cand.ID())
		b.w.core.ShowParcels(cand.Parcels)
	}
}

func baseName(path string) string {
	if i := strings.LastIndexAny(path, `/\`); i >= 0 {
		return path[i+1:]
	}
	return path
}
