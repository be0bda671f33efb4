package desk

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync/atomic"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/container"
	"fyne.io/fyne/v2/dialog"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/layout"
	toolkit "fyne.io/fyne/v2/theme"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/core"
	"groundtally/app/desk/mapview"
	"groundtally/app/desk/stages/accounts"
	"groundtally/app/desk/stages/appendix"
	"groundtally/app/desk/stages/ground"
	"groundtally/app/desk/stages/plant"
	"groundtally/app/desk/stages/weigh"
	"groundtally/app/desk/strip"
	"groundtally/app/desk/theme"
	"groundtally/app/desk/widgets"
	"groundtally/app/live"
	"groundtally/app/present"
	"groundtally/app/program"
	"groundtally/app/study"
	"groundtally/geo"
)

// Name of what the window keeps about itself between starts.
const (
	lastKey  = "study"
	stageKey = "stage"
	voiceKey = "voice"
	lookKey  = "look"
	wideKey  = "pane"

	backdropKey = "backdrop"
)

// Window is the program's window.
type Window struct {
	app    fyne.App
	window fyne.Window
	parts  *program.Parts
	core   *core.Core
	theme  *theme.Theme
	clock  func() time.Time
	do     func(func()) // runs something on the window's goroutine

	stages  []core.Stage
	panes   []fyne.CanvasObject
	oldLook []bool // by stage: it was hidden when the look changed
	at      int
	ground  *ground.Stage

	rail    *rail
	bar     *bar
	foot    *foot
	picture *picture
	strip   *strip.Strip
	pane    *fyne.Container
	middle  *container.Split // map and pane
	upright *container.Split // those and the strip
	bubble  *bubble
	layers  *fyne.Container // all, and what lies over it

	held    map[string]func() // what the keys of the window do, by shortcut
	round   int               // of the newest opening
	closing bool
	// Busy, which may be nil, is told when computing begins and when it ends.
	Busy    func(bool)
	locked  string      // the study's file when it can be read only
	pending atomic.Bool // an update of the core waits for its turn
}

// New makes the window; it shows nothing until a study is opened or Offer is called.
func New(a fyne.App, parts *program.Parts) *Window {
	w := &Window{app: a, parts: parts, clock: time.Now, do: fyne.Do}
	w.theme = theme.New(theme.Mode(a.Preferences().StringWithFallback(lookKey, string(theme.Light))))
	a.Settings().SetTheme(w.theme)
	w.window = a.NewWindow("Groundtally")
	w.window.SetPadded(false)
	w.window.SetMaster()
	w.window.Resize(fyne.NewSize(1366, 768))
	w.window.SetCloseIntercept(w.close)
	a.Lifecycle().SetOnEnteredForeground(w.look)
	w.bubble = newBubble(func(f func()) { w.do(f) })
	w.window.SetOnDropped(w.dropped)
	return w
}

// build makes everything that shows a study, anew for every study, so that nothing of one is left in
// another.
func (w *Window) build() {
	c := core.New(w.app, w.window, w.parts, w.theme)
	w.core = c
	c.Do = func(f func()) {
		w.do(func() {
			if w.core == c {
				f()
			}
		})
	}
	c.Always = w.do
	w.ground = ground.New(c)
	w.stages = []core.Stage{w.ground, plant.New(c), accounts.New(c), weigh.New(c), appendix.New(c)}
	w.panes, w.oldLook = make([]fyne.CanvasObject, len(w.stages)), make([]bool, len(w.stages))
	c.ShowStage = func(title string) {
		if i := slices.IndexFunc(w.stages, func(s core.Stage) bool { return s.Title() == title }); i >= 0 {
			w.choose(i)
		}
	}
	c.Tell = func(words string) { w.foot.tell(words) }
	w.rail, w.bar, w.foot = newRail(w), newBar(w), newFoot(w)
	w.picture = newPicture(w)
	c.ShowZones = w.picture.showZones
	c.Sketch = func(kind geo.Kind, words string, from *geo.LonLat, done func([]geo.LonLat, float64)) {
		w.picture.m.Sketch(mapview.Sketch{Kind: kind, Words: words, From: from, Done: done})
	}
	c.MovePoints = func(p mapview.Points) func(bool) {
		w.picture.m.MovePoints(p)
		return w.picture.m.EndPoints
	}
	c.ParcelAt = func(at geo.LonLat) string { return w.picture.m.ParcelAt(at) }
	c.ShowParcels, c.ShowPlace, c.Boxed = w.picture.showParcels, w.picture.showPlace, func() []string { return w.picture.boxed }
	w.strip = strip.New(c)
	w.strip.OnTaller = func(taller bool) {
		w.upright.SetOffset(map[bool]float64{false: stripLow, true: stripHigh}[taller])
	}
	w.pane = container.NewStack()
	paneRoom := container.NewStack(widgets.NewGround(toolkit.ColorNameBackground, fyne.NewSize(430, 200)), container.New(layout.NewCustomPaddedLayout(8, 4, 14, 10), w.pane))
	w.middle = container.NewHSplit(w.picture.all, paneRoom)
	w.middle.SetOffset(w.app.Preferences().FloatWithFallback(wideKey, 0.47))
	w.upright = container.NewVSplit(w.middle, w.strip)
	w.upright.SetOffset(stripLow)
	page := container.NewBorder(w.bar.all, w.foot.all, w.rail.all, nil, w.upright)
	w.layers = container.NewStack(widgets.NewGround(toolkit.ColorNameBackground, fyne.Size{}), page, w.bubble.layer)
	widgets.Explainer = w.bubble.explain
	c.OnChange(w.changed)
	w.keys()
	w.at = -1
}

// Where the strip begins, as a share of the height.
const (
	stripLow  = 0.66
	stripHigh = 0.42
)

// choose shows a stage.
func (w *Window) choose(i int) {
	if i == w.at {
		return
	}
	w.at = i
	if w.oldLook[i] && w.panes[i] != nil { // the toolkit gives new colours to what is shown alone
		w.panes[i].Refresh()
	}
	w.oldLook[i] = false
	w.bubble.explain(nil, "", fyne.Position{})
	if w.panes[i] == nil {
		w.panes[i] = w.stages[i].Content()
	}
	w.pane.Objects = []fyne.CanvasObject{w.panes[i]}
	w.pane.Refresh()
	w.app.Preferences().SetInt(stageKey, i)
	w.rail.update()
}

// changed follows the core.
func (w *Window) changed(ch core.Change) {
	if ch&core.LookChanged != 0 {
		for i := range w.oldLook {
			w.oldLook[i] = i != w.at
		}
	}
	for _, s := range w.stages {
		s.Changed(ch)
	}
	w.rail.update()
	if ch&^core.WorkChanged != 0 {
		w.bar.update()
		w.picture.changed(ch)
	}
	w.foot.update()
	if ch&core.ShadeChanged != 0 {
		w.app.Preferences().SetString(voiceKey, w.core.Voice())
	}
}

// attach shows an open session.
func (w *Window) attach(s *live.Session) {
	var old *live.Session
	if w.core != nil {
		old = w.core.Session
		w.picture.close()
		for _, o := range w.window.Canvas().Overlays().List() { // a form of the study before
			w.window.Canvas().Overlays().Remove(o)
		}
	}
	w.build()
	voice := w.app.Preferences().String(voiceKey) // read first: attaching shows the study's first voice, which is kept as any other
	w.core.Attach(s)
	if w.at < 0 { // panes are made over a study
		w.choose(min(max(w.app.Preferences().IntWithFallback(stageKey, 3), 0), len(w.stages)-1))
	}
	if voice != "" {
		w.core.SetVoice(voice)
	}
	w.window.SetContent(w.layers)
	w.core.Emit(core.Everything)
	if old != nil {
		go func() { _ = old.Close() }() // its edits are saved; nothing of it is shown any more
	}
}

// notify is told by sessions, from any goroutine, that there is something new. Calls that come in quick
// succession lead to one update.
func (w *Window) notify() {
	if !w.pending.CompareAndSwap(false, true) {
		return
	}
	w.do(func() {
		w.pending.Store(false)
		if w.core != nil && w.core.Session != nil { // whichever session told
			w.core.Update()
		}
	})
}

// mapFirst is how long the computing of a study that was just opened waits for its map at most.
const mapFirst = 2 * time.Second

// start opens a session over a store, off the window's goroutine, and shows it.
func (w *Window) start(store study.Store, round int, then func(s *live.Session)) error {
	s, err := live.Start(context.Background(), store, live.Config{Catalog: w.parts.Catalog, Params: w.parts.Params, Who: w.parts.Who, Clock: w.clock, Wait: true, Busy: w.Busy, Notify: func() {
		w.notify()
	}})
	if err != nil {
		_ = store.Close()
		return err
	}
	time.AfterFunc(mapFirst, s.Release)
	locked := ""
	if f, err := os.OpenFile(store.Path(), os.O_RDWR, 0); errors.Is(err, fs.ErrPermission) {
		locked = store.Path()
	} else if err == nil {
		_ = f.Close()
	}
	w.do(func() {
		if round != w.round { // another study was asked for meanwhile
			go func() { _ = s.Close() }()
			return
		}
		w.locked = locked
		w.attach(s)
		w.app.Preferences().SetString(lastKey, store.Path())
		if then != nil {
			then(s)
		}
	})
	return nil
}

// Open opens a study file; what keeps it from being opened is shown, with a way on.
func (w *Window) Open(path string) {
	round := w.busy("Opening " + filepath.Base(path) + "…")
	go func() {
		ctx := context.Background()
		store, err := w.parts.Open(ctx, path)
		if err == nil {
			err = w.start(store, round, nil)
		}
		if err != nil {
			w.do(func() { w.offer(err, path) })
		}
	}()
}

// Create makes a new empty study.
func (w *Window) Create(path string) {
	if filepath.Ext(path) == "" {
		path += ".gpkg"
	}
	round := w.busy("Making " + filepath.Base(path) + "…")
	go func() {
		store, err := w.parts.Create(context.Background(), path)
		if err == nil {
			err = w.start(store, round, func(*live.Session) { w.core.ShowStage("Ground") })
		}
		if err != nil {
			w.do(func() { w.offer(err, path) })
		}
	}()
}

// SamplePath is where the sample study lies: in the user's cache, since it can always be made again.
func SamplePath() string {
	dir, err := os.UserCacheDir()
	if err != nil {
		dir = os.TempDir()
	}
	return filepath.Join(dir, "groundtally", "marram.gpkg")
}

// Sample opens the sample study, making it where it is not there yet or only in part.
func (w *Window) Sample(path string) {
	round := w.busy("Opening the sample study…")
	go func() {
		ctx := context.Background()
		if err := w.openSample(ctx, path, round); err != nil {
			w.do(func() { w.offer(err, path) })
		}
	}()
}

func (w *Window) openSample(ctx context.Context, path string, round int) error {
	store, err := w.parts.Open(ctx, path)
	if err == nil {
		half, err := halfMade(ctx, store)
		if err != nil {
			_ = store.Close()
			return err
		}
		if !half {
			return w.start(store, round, nil)
		}
		if err := store.Close(); err != nil {
			return err
		}
		if err := os.Remove(path); err != nil {
			return err
		}
	} else if !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		return err
	}
	if store, err = w.parts.Create(ctx, path); err != nil {
		return err
	}
	return w.start(store, round, func(s *live.Session) {
		w.core.Edit("make the sample study", func(ctx context.Context, st *study.Study) error {
			tools, done := w.parts.Tools()
			defer done()
			return w.parts.Sample(ctx, st, tools, func(study.LayerRecord) {
				_ = s.Refresh()
				<-s.Released() // the first layers are on the map before the next are read
			})
		}, nil)
	})
}

// halfMade reports whether a sample study was left unfinished, with nothing of the user's in it.
func halfMade(ctx context.Context, store study.Store) (bool, error) {
	st, err := store.Load(ctx)
	if err != nil {
		return false, err
	}
	for _, r := range st.Records {
		if r.Kind == study.SettingRecord {
			return false, nil
		}
	}
	return !slices.ContainsFunc(st.Journal, func(e study.Entry) bool { return e.Reason != "sample district" }), nil
}

// look reads the study anew when another program has changed it, as when the user comes back to the window.
func (w *Window) look() {
	if w.core == nil || w.core.Session == nil {
		return
	}
	c, changed := w.core, false
	c.Session.Edit(func(ctx context.Context, s *study.Study) (err error) {
		changed, err = s.Reload(ctx)
		return err
	}, func(err error) {
		c.Do(func() {
			c.Update()
			switch {
			case err != nil: // told at the foot, since this comes at every return to the window
				w.foot.tell("The study's file cannot be read: " + present.Problem(err))
			case changed:
				w.foot.tell("Another program changed the study; it was read again.")
			}
		})
	})
}

// busy shows that something is being opened, and numbers the opening: the newest counts.
func (w *Window) busy(words string) int {
	w.round++
	if w.core != nil && w.core.Session != nil {
		w.foot.tell(words)
		return w.round
	}
	w.window.SetContent(container.NewStack(widgets.NewGround(toolkit.ColorNameBackground, fyne.Size{}), container.NewCenter(widgets.Part(words).Wide())))
	return w.round
}

// dropped takes files that were dropped on the window.
func (w *Window) dropped(_ fyne.Position, uris []fyne.URI) {
	var paths []string
	for _, u := range uris {
		paths = append(paths, u.Path())
	}
	if len(paths) == 1 && strings.EqualFold(filepath.Ext(paths[0]), ".gpkg") {
		w.droppedPackage(paths[0])
		return
	}
	w.take(paths)
}

// droppedPackage opens a study, and imports any other GeoPackage.
func (w *Window) droppedPackage(path string) {
	go func() {
		store, err := w.parts.Open(context.Background(), path)
		if err == nil {
			_ = store.Close()
		}
		w.do(func() {
			if errors.Is(err, study.ErrNotAStudy) {
				w.take([]string{path})
				return
			}
			w.Open(path)
		})
	}()
}

func (w *Window) take(paths []string) {
	if w.core == nil || w.core.Session == nil {
		dialog.ShowInformation("No study is open", "Open a study or make a new one, then drop the file again.", w.window)
		return
	}
	w.core.ShowStage("Ground")
	w.ground.Import(paths...)
}

// close ends the program after everything is saved.
func (w *Window) close() {
	if w.closing {
		return
	}
	w.closing = true
	if w.core == nil || w.core.Session == nil {
		w.app.Quit()
		return
	}
	w.app.Preferences().SetFloat(wideKey, w.middle.Offset)
	// Nothing can be changed any more while what was changed is saved.
	words := widgets.Part("Saving what was changed…").Wide()
	widget.NewModalPopUp(container.NewPadded(words), w.window.Canvas()).Show()
	s, m := w.core.Session, w.picture
	go func() {
		err := s.Close()
		m.close()
		w.do(func() {
			if err != nil {
				fmt.Fprintln(os.Stderr, "groundtally: close the study:", err)
			}
			w.app.Quit()
		})
	}()
}

// keys sets the keys that hold in the whole window.
func (w *Window) keys() {
	cv := w.window.Canvas()
	w.held = map[string]func(){}
	add := func(s fyne.Shortcut, do func()) {
		w.held[s.ShortcutName()] = do
		cv.AddShortcut(s, func(fyne.Shortcut) { do() })
	}
	on := func(key fyne.KeyName, do func()) {
		add(&desktop.CustomShortcut{KeyName: key, Modifier: fyne.KeyModifierShortcutDefault}, do)
	}
	add(&fyne.ShortcutUndo{}, w.undo)
	add(&fyne.ShortcutRedo{}, w.redo)
	for i, key := range []fyne.KeyName{fyne.Key1, fyne.Key2, fyne.Key3, fyne.Key4, fyne.Key5} {
		on(key, func() { w.choose(i) })
	}
	on(fyne.KeyF, func() { cv.Focus(w.bar.find) })
	on(fyne.KeyO, w.chooseFile)
	on(fyne.KeyM, func() { cv.Focus(w.picture.m) })
	on(fyne.KeyU, func() { w.strip.SetHigh(true) })
	cv.SetOnTypedKey(func(e *fyne.KeyEvent) {
		switch e.Name {
		case fyne.KeyEscape:
			if !w.core.CloseLight() {
				w.picture.m.GiveUp()
			}
		case fyne.KeyF1:
			w.showKeys()
		}
	})
}

// undo takes back the last edit; while points are moved on the map, the last move.
func (w *Window) undo() {
	if !w.picture.m.TakeBack() {
		w.core.Undo()
	}
}

func (w *Window) redo() {
	if !w.picture.m.BringBack() {
		w.core.Redo()
	}
}

// switchLook goes from light to dark and back.
func (w *Window) switchLook() {
	mode := theme.Dark
	if w.theme.Dark(w.app.Settings().ThemeVariant()) {
		mode = theme.Light
	}
	*w.theme = *theme.New(mode)
	w.app.Preferences().SetString(lookKey, string(mode))
	w.app.Settings().SetTheme(w.theme)
	w.do(func() { w.core.Emit(core.LookChanged) }) // apart, so that the window answers in between
}

// chooseFile asks for a study to open.
func (w *Window) chooseFile() {
	d := dialog.NewFileOpen(func(r fyne.URIReadCloser, err error) {
		if r == nil || err != nil {
			return
		}
		path := r.URI().Path()
		_ = r.Close()
		w.Open(path)
	}, w.window)
	d.SetFilter(studyFiles{})
	d.SetTitleText("Open a study")
	d.Resize(fyne.NewSize(820, 560))
	d.Show()
}

type studyFiles struct{}

// Matches implements storage.FileFilter.
func (studyFiles) Matches(u fyne.URI) bool { return strings.EqualFold(u.Extension(), ".gpkg") }

// chooseNew asks where a new study is to lie.
func (w *Window) chooseNew() {
	d := dialog.NewFileSave(func(r fyne.URIWriteCloser, err error) {
		if r == nil || err != nil {
			return
		}
		path := r.URI().Path()
		_ = r.Close()
		// The dialog made an empty file; a study is made where there is none.
		if st, err := os.Stat(path); err == nil && st.Size() == 0 {
			_ = os.Remove(path)
		}
		w.Create(path)
	}, w.window)
	d.SetFileName("study.gpkg")
	d.SetTitleText("Make a new study")
	d.Resize(fyne.NewSize(820, 560))
	d.Show()
}

// showKeys lists the keys.
func (w *Window) showKeys() {
	rows := [][2]string{{"Ctrl 1 to 5", "the five stages"}, {"Ctrl F", "find a parcel"}, {"Ctrl M", "go to the map: arrows move, + and − zoom, 0 fits, Enter chooses, Esc lets go"},
		{"Ctrl Z, Ctrl Y", "take back, bring back"}, {"Ctrl O", "open a study"}, {"Ctrl U", "more room for the consequences"}, {"Tab, Shift Tab", "to the next, to the one before"}, {"Arrows, Enter", "in a list, in the consequences: move, open"}, {"F1", "this list"}}
	grid := container.New(layout.NewFormLayout())
	for _, r := range rows {
		key := widgets.NewLine(r[0]).Wide()
		key.Bold = true
		grid.Add(key)
		grid.Add(widgets.NewLine(r[1]).Wide())
	}
	w.core.Open(dialog.NewCustom("Keys", "Close", container.NewPadded(grid), w.window))
}

// End closes the window as its user would. It may be called from any goroutine.
func (w *Window) End() { w.do(w.close) }
