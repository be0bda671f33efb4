package desk

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/driver/desktop"
	"fyne.io/fyne/v2/storage"
	"fyne.io/fyne/v2/test"

	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/desk/theme"
	"groundtally/app/study"
)

// stand is a whole window under test, over a study file.
type stand struct {
	t testing.TB
	w *Window
	desktest.Queue
}

// open opens the window on a study of every n-th parcel of the sample.
func open(t *testing.T, every int) *stand { return openFor(t, every) }

// openFor is open, for benchmarks too.
func openFor(t testing.TB, every int) *stand {
	t.Helper()
	parts, err := desktest.Parts()
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "marram.gpkg")
	store, err := parts.Create(context.Background(), path)
	if err != nil {
		t.Fatal(err)
	}
	desktest.Fill(t, parts, store, every)
	if err := store.Close(); err != nil {
		t.Fatal(err)
	}
	s := empty(t)
	s.w.Open(path)
	s.settle()
	return s
}

// empty is a window without a study.
func empty(t testing.TB) *stand {
	t.Helper()
	parts, err := desktest.Parts()
	if err != nil {
		t.Fatal(err)
	}
	s := &stand{t: t}
	s.w = New(test.NewTempApp(t), parts)
	s.w.do = s.Do
	s.w.window.Resize(fyne.NewSize(1366, 768))
	t.Cleanup(func() {
		if s.w.core != nil && s.w.core.Session != nil {
			s.w.picture.close()
			_ = s.w.core.Session.Close()
		}
	})
	return s
}

func (s *stand) until(what string, holds func() bool) {
	s.t.Helper()
	for end := time.Now().Add(2 * time.Minute); ; time.Sleep(2 * time.Millisecond) {
		s.Pump()
		if holds() {
			return
		}
		if time.Now().After(end) {
			s.t.Fatalf("waited in vain until %s; the window is at %+v", what, s.w.state())
		}
	}
}

// settle waits until everything is saved, computed, ordered and drawn.
func (s *stand) settle() {
	s.t.Helper()
	s.until("a study is open", func() bool { return s.w.core != nil && s.w.core.Session != nil && s.w.core.View() != nil })
	saved := false
	s.w.core.Session.Edit(func(context.Context, *study.Study) error { return nil }, func(error) { s.Do(func() { saved = true }) })
	s.until("it is saved", func() bool { return saved })
	s.until("it is computed", func() bool {
		v := s.w.core.View()
		_, busy := s.w.core.Session.Work()
		return !busy && (v.Current || v.Problem != nil || v.Stopped)
	})
	s.until("it is in order", func() bool {
		v, r := s.w.core.View(), s.w.core.Ranking()
		return !v.Current || v.Board == nil || len(v.Board.Keys) == 0 || r != nil && r.Board == v.Board && r.Voice == s.w.core.Voice()
	})
	s.until("it is drawn", func() bool { return s.w.picture.ground != nil && s.w.picture.m.Settled() && !s.w.picture.busy })
}

func (s *stand) shoot(name string) {
	s.t.Helper()
	for _, mode := range []theme.Mode{theme.Light, theme.Dark} {
		*s.w.theme = *theme.New(mode)
		s.w.app.Settings().SetTheme(s.w.theme)
		s.w.core.Emit(core.LookChanged)
		s.settle()
		desktest.Save(s.t, "window-"+name+"-"+string(mode)+".png", s.w.window.Canvas().Capture())
	}
	*s.w.theme = *theme.New(theme.Light)
	s.w.app.Settings().SetTheme(s.w.theme)
	s.w.core.Emit(core.LookChanged)
	s.settle()
}

// press does what a shortcut does; that the toolkit leads keys there is tried in the real window.
func (s *stand) press(sc fyne.Shortcut) {
	s.t.Helper()
	do := s.w.held[sc.ShortcutName()]
	if do == nil {
		s.t.Fatalf("%s does nothing", sc.ShortcutName())
	}
	do()
	s.Pump()
}

func ctrl(key fyne.KeyName) fyne.Shortcut {
	return &desktop.CustomShortcut{KeyName: key, Modifier: fyne.KeyModifierControl}
}

// Every stage opens beside map and strip, by key and by the rail; all fits at 1366 by 768.
func TestStages(t *testing.T) {
	s := open(t, 30)
	if got := s.w.window.Canvas().Content().MinSize(); got.Width > 1366 || got.Height > 768 {
		t.Errorf("the window needs at least %v", got)
	}
	for i, want := range []string{"Ground", "Plant", "Accounts", "Weigh", "Appendix"} {
		s.press(ctrl([]fyne.KeyName{fyne.Key1, fyne.Key2, fyne.Key3, fyne.Key4, fyne.Key5}[i]))
		if got := s.w.state().Stage; got != want {
			t.Errorf("Ctrl %d opens %s, want %s", i+1, got, want)
		}
		for name, o := range map[string]fyne.CanvasObject{"map": s.w.picture.m, "strip": s.w.strip, "pane": s.w.pane} {
			if size := o.Size(); size.Width < 300 || size.Height < 120 {
				t.Errorf("in %s the %s has %v", want, name, size)
			}
		}
		if first, _, _ := s.w.stages[i].State(); first == "" {
			t.Errorf("the rail says nothing of %s", want)
		}
		s.shoot(strings.ToLower(want))
	}
	test.Tap(s.w.rail.buttons[1])
	if s.w.state().Stage != "Plant" {
		t.Error("the rail does not open a stage")
	}
}

// A click on a parcel chooses its best candidate, with control it adds another; the search does the same.
func TestChoosing(t *testing.T) {
	s := open(t, 30)
	c := s.w.core
	ids := c.ChosenIDs()
	if len(ids) != 1 || ids[0] != s.w.state().First {
		t.Fatalf("chosen at first: %v, leading: %s", ids, s.w.state().First)
	}
	var other string
	for site, name := range c.View().Index.Sites {
		if cand := c.BestAt(site); cand != nil && cand.ID() != ids[0] {
			other = name
			break
		}
	}
	s.w.picture.m.OnSelect(other, true)
	if got := c.ChosenIDs(); len(got) != 2 || !strings.HasPrefix(got[1], other+"/") {
		t.Errorf("after adding %s: %v", other, got)
	}
	s.w.bar.find.SetText(strings.ToLower(other))
	s.w.bar.find.OnSubmitted(s.w.bar.find.Text)
	if got := c.ChosenIDs(); len(got) != 1 || !strings.HasPrefix(got[0], other+"/") {
		t.Errorf("after the search: %v", got)
	}
	s.w.bar.find.OnSubmitted("no such parcel")
	if !strings.Contains(s.w.foot.words.Text, "no such parcel") {
		t.Errorf("a search without a find says %q", s.w.foot.words.Text)
	}
	s.until("the ground around it is drawn", func() bool { return s.w.picture.around[c.ChosenIDs()[0]] != nil })
	if words := s.w.picture.words(other); !strings.Contains(words, other) || !strings.Contains(words, "place") {
		t.Errorf("under the pointer: %q", words)
	}
}

// The map is coloured by the score or by any consequence, with classes that hold all parcels.
func TestColouring(t *testing.T) {
	s := open(t, 30)
	for _, key := range []string{"", "connection_km", "noise_dba", "eroi_delivered"} {
		s.w.core.SetShade(key)
		s.settle()
		j := *s.w.picture.wanted
		out := j.do()
		if len(out.shading.Class) != s.w.picture.ground.Parcels() {
			t.Fatalf("%q: %d classes for %d parcels", key, len(out.shading.Class), s.w.picture.ground.Parcels())
		}
		seen := map[uint8]int{}
		for _, c := range out.shading.Class {
			seen[c]++
			if c < 250 && int(c) >= len(out.shading.Colours) {
				t.Fatalf("%q: class %d of %d", key, c, len(out.shading.Colours))
			}
		}
		if key == "noise_dba" && (seen[255] == 0 || len(out.shading.Colours) != 0) {
			t.Errorf("noise is not assessed, yet the map shows %v", seen)
		}
		if key != "noise_dba" && len(out.shading.Colours) < 2 {
			t.Errorf("%q: %d classes", key, len(out.shading.Colours))
		}
		texts := []string{}
		for _, l := range out.legend {
			texts = append(texts, l.Text)
		}
		if slices.Contains(texts, "") || out.title == "" {
			t.Errorf("%q: legend %q %q", key, out.title, texts)
		}
	}
}

// Edits are saved at once, undone and redone by key, and are there after the program was ended and
// started again.
func TestUndoAndStartAgain(t *testing.T) {
	s := open(t, 60)
	path := s.w.state().Study
	before := s.w.state()
	s.w.core.Set("set the rule", "test", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "1200"})
	s.settle()
	if got := s.w.state(); got.Journal != before.Journal+1 || s.w.bar.saved.Text == "Saved" {
		t.Errorf("after an edit: %+v, %q", got, s.w.bar.saved.Text)
	}
	s.press(&fyne.ShortcutUndo{})
	s.settle()
	if v, _ := s.w.core.View().Snap.Number("rule.setback.dwellings.wind_m"); v == 1200 {
		t.Error("undo by key did nothing")
	}
	s.press(&fyne.ShortcutRedo{})
	s.settle()
	code := s.w.core.View().Results.Code
	if v, _ := s.w.core.View().Snap.Number("rule.setback.dwellings.wind_m"); v != 1200 {
		t.Error("redo by key did nothing")
	}
	if err := s.w.core.Session.Close(); err != nil {
		t.Fatal(err)
	}
	again := empty(t)
	again.w.Open(path)
	again.settle()
	if got := again.w.core.View(); got.Results.Code != code || len(got.Journal) != before.Journal+3 || got.CanUndo == "" {
		t.Errorf("started again: %d entries, code %v, want %v", len(got.Journal), got.Results.Code, code)
	}
}

// A dropped file opens the form of import; a dropped study is opened.
func TestDrop(t *testing.T) {
	s := open(t, 60)
	file := filepath.Join(t.TempDir(), "Heritage sites.geojson")
	text := `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"name":"Old mill"},"geometry":{"type":"Point","coordinates":[-26.95,47.5]}}]}`
	if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	s.w.dropped(fyne.Position{}, []fyne.URI{storage.NewFileURI(file)})
	s.until("the form is open", func() bool { return s.w.state().Over > 0 })
	if s.w.state().Stage != "Ground" {
		t.Errorf("the file went to %s", s.w.state().Stage)
	}
	desktest.Save(t, "window-import-light.png", s.w.window.Canvas().Capture())
}

// What keeps a study from being opened is said on the first page, and the page offers the ways on.
func TestOffer(t *testing.T) {
	s := empty(t)
	s.w.Offer()
	desktest.Save(t, "window-offer-light.png", s.w.window.Canvas().Capture())
	broken := filepath.Join(t.TempDir(), "broken.gpkg")
	if err := os.WriteFile(broken, []byte("no database"), 0o600); err != nil {
		t.Fatal(err)
	}
	s.w.Open(broken)
	said := func() string {
		text := ""
		for _, o := range test.LaidOutObjects(s.w.window.Content()) {
			if l, ok := o.(interface{ String() string }); ok {
				text += l.String()
			}
			text += wordsOf(o) + "\n"
		}
		return text
	}
	s.until("the page says so", func() bool { return strings.Contains(said(), "broken.gpkg could not be opened") })
	for _, want := range []string{"The sample study", "Make a new study", "Open another study"} {
		if !strings.Contains(said(), want) {
			t.Errorf("the page does not offer %q:\n%s", want, said())
		}
	}
	made := filepath.Join(t.TempDir(), "new.gpkg")
	s.w.Create(made)
	s.until("the new study is open", func() bool { return s.w.core != nil && s.w.core.Session != nil && s.w.state().Study == made })
	s.until("it says what is missing", func() bool { return s.w.state().Problem != "" })
	if s.w.state().Stage != "Ground" {
		t.Errorf("a new study opens at %s", s.w.state().Stage)
	}
}

// A sample that was left half made is made again; one with an edit of the user's is kept.
func TestHalfMadeSample(t *testing.T) {
	parts, err := desktest.Parts()
	if err != nil {
		t.Fatal(err)
	}
	ctx := context.Background()
	store, err := parts.Create(ctx, filepath.Join(t.TempDir(), "half.gpkg"))
	if err != nil {
		t.Fatal(err)
	}
	defer store.Close()
	if half, err := halfMade(ctx, store); err != nil || !half {
		t.Errorf("an empty one: half %v, error %v", half, err)
	}
	st, err := study.Open(ctx, store, parts.Catalog, study.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := st.Set(ctx, "set", "mine", study.SettingEdit{Key: "study.name", Value: "Mine"}); err != nil {
		t.Fatal(err)
	}
	if half, err := halfMade(ctx, store); err != nil || half {
		t.Errorf("one with an edit: half %v, error %v", half, err)
	}
}

// The problem list, the cautions and the keys open, each entry with what to do.
func TestLists(t *testing.T) {
	s := open(t, 60)
	s.w.showProblems()
	if s.w.state().Over != 1 {
		t.Fatal("the problem list did not open")
	}
	s.Pump()
	desktest.Save(t, "window-problems-light.png", s.w.window.Canvas().Capture())
	for _, p := range s.w.problems() {
		if p.words == "" || p.grade == "" || p.stage == "" && p.at == nil {
			t.Errorf("an entry without words or cure: %+v", p)
		}
	}
	s.w.core.CloseLight()
	for what, open := range map[string]func(){"the cautions": s.w.showCautions, "the keys": s.w.showKeys, "an error": func() { s.w.core.Fail("try", errors.New("nothing")) }} {
		open()
		s.Pump()
		if s.w.state().Over != 1 {
			t.Errorf("%s: %d dialogs are open", what, s.w.state().Over)
		}
		s.w.core.CloseLight() // as Escape does
		if s.w.state().Over != 0 {
			t.Errorf("Escape does not close %s", what)
		}
	}
}

// Another study in the same window has nothing of the one before: no choice, no shade, no box, no answer
// that comes late.
func TestSecondStudy(t *testing.T) {
	s := open(t, 60)
	first := s.w.core
	s.w.core.SetShade("connection_km")
	s.w.picture.boxed = []string{"M-0001"}
	late := false
	first.Do(func() { late = true })
	made := filepath.Join(t.TempDir(), "second.gpkg")
	s.w.Create(made)
	s.until("the second study is open", func() bool { return s.w.core != first && s.w.state().Study == made })
	late = false
	first.Do(func() { late = true })
	s.Pump()
	if late {
		t.Error("an answer for the first study reached the window")
	}
	if st := s.w.state(); len(st.Chosen) != 0 || st.Layers != 0 || s.w.core.Shade() != "" || len(s.w.picture.boxed) != 0 || s.w.bar.name.Text != "second" {
		t.Errorf("the second study shows %+v, shade %q, box %v, name %q", st, s.w.core.Shade(), s.w.picture.boxed, s.w.bar.name.Text)
	}
	s.until("it says what is missing", func() bool { return s.w.state().Problem != "" })
}

// Terms carry their sentence: it is shown when the pointer rests, and goes when it leaves.
func TestSentences(t *testing.T) {
	s := open(t, 60)
	s.w.bubble.explain(s.w.strip, "Share of the energy that is left.", fyne.NewPos(1300, 740))
	s.until("it is shown", func() bool { return s.w.bubble.ground.Visible() })
	at, size := s.w.bubble.ground.Position(), s.w.bubble.ground.Size()
	if room := s.w.bubble.layer.Size(); at.X < 0 || at.Y < 0 || at.X+size.Width > room.Width || at.Y+size.Height > room.Height {
		t.Errorf("the sentence stands at %v with %v in %v", at, size, room)
	}
	s.w.bubble.explain(s.w.strip, "", fyne.Position{})
	if s.w.bubble.ground.Visible() {
		t.Error("it stays")
	}
}
