package desk

import (
	"os"
	"path/filepath"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/widgets"
	"groundtally/app/present"
)

// Offer shows the first page: the last study, the sample study, a new one, another one.
func (w *Window) Offer() { w.offer(nil, "") }

// offer shows the first page, with what kept a study from being opened.
func (w *Window) offer(err error, path string) {
	if w.core != nil && w.core.Session != nil { // a study is open: it stays
		w.core.Fail("open "+filepath.Base(path), err)
		return
	}
	column := container.New(layout.NewCustomPaddedVBoxLayout(10))
	title := widgets.Heading("Groundtally")
	title.TextSize = 26
	column.Add(title)
	column.Add(widgets.NewText("Which parcels of a district should host community wind or solar, and why: every score unfolds into the quantities, units, sources and uncertainties behind it."))
	if err != nil {
		name := widgets.Warm(filepath.Base(path) + " could not be opened")
		name.Bold, name.TextSize = true, 13
		column.Add(name)
		column.Add(widgets.NewText(present.Problem(err)))
	}
	var first fyne.Focusable
	add := func(icon fyne.Resource, words, detail string, do func()) {
		b := widgets.NewEnterButton(words, icon, do)
		if first == nil {
			b.Importance, first = widget.HighImportance, b
		}
		column.Add(container.NewVBox(b, container.New(layout.NewCustomPaddedLayout(0, 4, 30, 0), widgets.Faint(detail))))
	}
	if last := w.app.Preferences().String(lastKey); last != "" && last != path {
		if st, serr := os.Stat(last); serr == nil {
			add(toolkit.HistoryIcon(), "Go on with "+filepath.Base(last), filepath.Dir(last)+" · changed "+core.Clock(st.ModTime(), time.Now()), func() { w.openOrSample(last) })
		}
	}
	add(toolkit.HomeIcon(), "The sample study: Isle of Marram", "An invented district with parcels, constraints, plant options and three voices, to try everything on.", func() { w.Sample(SamplePath()) })
	add(toolkit.DocumentCreateIcon(), "Make a new study…", "One file, an ordinary GeoPackage. Then add the parcels.", w.chooseNew)
	add(toolkit.FolderOpenIcon(), "Open another study…", "Or drop it on this window.", w.chooseFile)
	column.Add(widgets.NewText("A screening: it replaces no permit, no survey and no grid operator's study. Local codes and licensed practice prevail. The program opens no network connection."))
	sized := container.New(&columnLayout{width: 560}, column)
	w.window.SetContent(container.NewStack(widgets.NewGround(toolkit.ColorNameBackground, fyne.Size{}), container.NewCenter(sized)))
	if first != nil {
		w.window.Canvas().Focus(first)
	}
}

// openOrSample opens a study; the sample is made again where it was left half made.
func (w *Window) openOrSample(path string) {
	if path == SamplePath() {
		w.Sample(path)
		return
	}
	w.Open(path)
}

// columnLayout gives its one object a width and the height that it needs.
type columnLayout struct{ width float32 }

// Layout implements fyne.Layout.
func (l *columnLayout) Layout(o []fyne.CanvasObject, s fyne.Size) {
	for _, c := range o {
		c.Move(fyne.NewPos(0, 0))
		c.Resize(s)
	}
}

// MinSize implements fyne.Layout.
func (l *columnLayout) MinSize(o []fyne.CanvasObject) fyne.Size {
	h := float32(0)
	for _, c := range o {
		if s := c.Size(); s.Width != l.width { // wrapped texts know their height once they know their width
			c.Resize(fyne.NewSize(l.width, max(s.Height, c.MinSize().Height)))
		}
		h = max(h, c.MinSize().Height)
	}
	return fyne.NewSize(l.width, h)
}
