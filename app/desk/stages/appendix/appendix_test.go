package appendix

import (
	"context"
	"encoding/json"
	"fmt"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	page "groundtally/app/appendix"
	"groundtally/app/desk/desktest"
	"groundtally/app/desk/widgets"
	"groundtally/app/program"
	"groundtally/app/run"
	"groundtally/app/study"
)

type bench struct {
	*desktest.Bench
	s    *Stage
	told []string
	urls []*url.URL
}

// browser is an app that keeps what it was asked to open.
type browser struct {
	fyne.App
	b *bench
}

func (w browser) OpenURL(u *url.URL) error {
	w.b.urls = append(w.b.urls, u)
	return nil
}

func open(t *testing.T) *bench {
	t.Helper()
	b := &bench{Bench: desktest.New(t, 60)}
	b.Settle()
	b.Core.App = browser{b.App, b}
	b.Core.Tell = func(w string) { b.told = append(b.told, w) }
	b.s = New(b.Core)
	b.s.now = func() time.Time { return time.Date(2031, 5, 3, 15, 20, 0, 0, time.UTC) }
	b.Core.OnChange(b.s.Changed)
	b.Show(b.s.Content(), 520, 480)
	return b
}

func (b *bench) shoot(name string) {
	for _, s := range []fyne.Size{fyne.NewSize(520, 480), fyne.NewSize(760, 560), fyne.NewSize(430, 470)} {
		b.Window.Resize(s)
		b.Shoot(fmt.Sprintf("appendix-%s-%.0f", name, s.Width))
	}
	b.Window.Resize(fyne.NewSize(520, 480))
}

// set makes an edit.
func (b *bench) set(key, val string) {
	b.T.Helper()
	b.Core.Set("set", "a reason of the test", study.SettingEdit{Key: key, Value: val})
	b.Settle()
}

func (b *bench) idle() {
	b.T.Helper()
	b.Until("the work is done", func() bool { return b.s.job == nil })
}

// lines gives all texts of an object that are shown.
func lines(o fyne.CanvasObject) string {
	var out []string
	for _, o := range test.LaidOutObjects(o) {
		switch o := o.(type) {
		case *widgets.Line:
			out = append(out, o.Text)
		case *widgets.Paragraph:
			out = append(out, o.Text)
		case *widget.Label:
			out = append(out, o.Text)
		}
	}
	return strings.Join(out, "\n")
}

func TestPictures(t *testing.T) {
	b := open(t)
	s := b.s
	b.shoot("make")
	s.make.heads[1].entry.SetText("J. Example")
	b.shoot("unsaved")
	s.make.heads[1].entry.SetText("")
	s.make.folder.SetText(filepath.Join(t.TempDir(), "Marram appendix"))
	test.Tap(s.make.make)
	b.idle()
	s.make.progress.begin("Making the appendix", func() {})
	s.make.progress.show("page", 3, 6)
	b.shoot("making")
	s.make.progress.end()
	test.Tap(s.make.verify)
	b.idle()
	b.shoot("made")
	s.make.scroll.ScrollToOffset(fyne.NewPos(0, 190))
	b.shoot("verified")
	s.make.scroll.ScrollToBottom()
	b.shoot("foot")
	s.make.verdict.show(b.Core, []finding{{with: "the appendix", diff: &run.Difference{Where: "M-0001 with wind5, noise_dba", Old: "38 40 42", New: "38 41 42"}, code: strings.Repeat("ab", 32)}})
	s.make.scroll.ScrollToOffset(fyne.NewPos(0, 190))
	b.shoot("differs")
	b.set("rule.setback.dwellings.wind_m", "900")
	b.set("voice.residents.weight.noise_dba", "77")
	b.Core.Undo()
	b.Settle()
	s.make.scroll.ScrollToTop()
	b.shoot("changed")
	s.tabs.Choose(1)
	b.Until("the journal is there", func() bool { return len(s.journal.found.shown) > 0 })
	b.shoot("journal")
	s.tabs.Choose(2)
	s.frozen.name.SetText("as shown on 3 May")
	test.Tap(s.frozen.freeze)
	b.Until("it is frozen", func() bool { return len(b.Core.View().Frozen) == 1 })
	s.frozen.verify(b.Core.View().Frozen[0])
	b.idle()
	b.shoot("frozen")
}

func TestMake(t *testing.T) {
	b := open(t)
	p := b.s.make
	if first, _, warn := b.s.State(); first != "not made yet" || warn {
		t.Errorf("state %q, %v", first, warn)
	}
	if !p.make.Disabled() || !strings.Contains(p.said.Text, "folder") {
		t.Errorf("it can be made without a folder; said %q", p.said.Text)
	}
	folder := filepath.Join(t.TempDir(), "new", "appendix")
	p.folder.SetText(folder)
	p.heads[1].entry.SetText("J. Example")
	if !p.make.Disabled() || p.saveHead.Disabled() {
		t.Error("it can be made with an author that is not saved")
	}
	test.Tap(p.saveHead)
	b.Settle()
	if b.Core.View().Snap.Text("study.author") != "J. Example" || p.make.Disabled() {
		t.Fatal("the author was not saved, or it cannot be made")
	}
	test.Tap(p.make)
	if first, _, _ := b.s.State(); first != "being made" {
		t.Errorf("state %q", first)
	}
	b.idle()
	code := b.Core.View().Results.Code.Check
	html, err := os.ReadFile(filepath.Join(folder, page.PageFile))
	if err != nil || !strings.Contains(string(html), "J. Example") || !strings.Contains(string(html), code) {
		t.Fatalf("%v, %d bytes", err, len(html))
	}
	stamp, err := page.ReadStamp(folder)
	if err != nil || stamp.Code.Check != code {
		t.Fatal(err)
	}
	if first, _, warn := b.s.State(); !strings.HasPrefix(first, "made at ") || warn {
		t.Errorf("state %q, %v", first, warn)
	}
	if !strings.Contains(p.where.Text, short(code)) || !strings.Contains(p.where.Text, folder) || !strings.Contains(p.where.Text, "kB") {
		t.Errorf("said %q", p.where.Text)
	}
	test.Tap(p.look)
	test.Tap(p.show)
	if len(b.urls) != 2 || b.urls[0].Scheme != "file" || b.urls[0].Path != filepath.ToSlash(filepath.Join(folder, page.PageFile)) {
		t.Errorf("opened %v", b.urls)
	}
	b.set("rule.setback.dwellings.wind_m", "900")
	if _, second, warn := b.s.State(); second != "not made since change" || !warn || !strings.Contains(p.where.Text, "Not made since") {
		t.Errorf("state %q, %v; said %q", second, warn, p.where.Text)
	}
	b.Core.Undo()
	b.Settle()
	if first, _, warn := b.s.State(); !strings.HasPrefix(first, "made at ") || warn {
		t.Errorf("the state is as it was when it was made, and it says %q, %v", first, warn)
	}
	// another stage on the same study remembers
	if again := New(b.Core); again.lastMade().Code != code {
		t.Error("it was forgotten")
	}
}

func TestMakeStopsAndFails(t *testing.T) {
	b := open(t)
	p := b.s.make
	p.folder.SetText(filepath.Join(t.TempDir(), "a"))
	test.Tap(p.make)
	test.Tap(p.progress.stop)
	b.idle()
	if m := b.s.lastMade(); m.Code != "" && !exists(filepath.Join(m.Folder, page.PageFile)) {
		t.Error("it is said to be made and is not there")
	}
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	p.folder.SetText(file)
	before := b.s.lastMade()
	test.Tap(p.make)
	b.idle()
	if b.Window.Canvas().Overlays().Top() == nil || b.s.lastMade() != before {
		t.Error("a file in place of the folder was no problem")
	}
}

func exists(path string) bool {
	_, err := os.Stat(path)
	return err == nil
}

func TestVerify(t *testing.T) {
	b := open(t)
	p := b.s.make
	folder := t.TempDir()
	p.folder.SetText(folder)
	test.Tap(p.verify)
	b.idle()
	if text := lines(p.verdict.box); !strings.Contains(text, "Identical to the stored results") || strings.Contains(text, "the appendix") {
		t.Errorf("found %q", text)
	}
	test.Tap(p.make)
	b.idle()
	p.with.SetChecked(true)
	test.Tap(p.verify)
	b.idle()
	if text := lines(p.verdict.box); !strings.Contains(text, "Identical to the appendix") {
		t.Errorf("found %q", text)
	}
	b.set("rule.setback.dwellings.wind_m", "1500")
	if text := lines(p.verdict.box); text != "" {
		t.Errorf("of another state it is still said: %q", text)
	}
	test.Tap(p.verify)
	b.idle()
	text := lines(p.verdict.box)
	if !strings.Contains(text, "Identical to the stored results") || !strings.Contains(text, "Differs from the appendix") || !strings.Contains(text, "Expected") {
		t.Errorf("found %q", text)
	}
	if err := os.WriteFile(filepath.Join(folder, page.StampFile), []byte("{"), 0o600); err != nil {
		t.Fatal(err)
	}
	test.Tap(p.verify)
	b.idle()
	if b.Window.Canvas().Overlays().Top() == nil {
		t.Error("a damaged check code was no problem")
	}
}

func TestJournal(t *testing.T) {
	b := open(t)
	b.s.tabs.Choose(1)
	p := b.s.journal
	all := func() bool { return len(p.found.lines) == len(b.Core.View().Journal) }
	b.Until("the journal is there", all)
	old := b.Core.View().Snap.Text("voice.residents.weight.noise_dba")
	b.set("voice.residents.weight.noise_dba", "77")
	b.Until("the change is there", all)
	first := p.found.lines[p.found.shown[0]]
	title := lower(b.Core.Info("noise_dba").Title)
	if !strings.Contains(first.what, title) || !strings.Contains(first.what, old+" swing points → 77 swing points") || !strings.Contains(first.head, "Tester") || first.reason != "a reason of the test" {
		t.Errorf("%+v", first)
	}
	if !strings.Contains(p.undone.Text, title) || p.undo.Disabled() || !p.redo.Disabled() {
		t.Errorf("undo says %q", p.undone.Text)
	}
	test.Tap(p.undo)
	b.Settle()
	b.Until("the undo is there", all)
	if got := b.Core.View().Snap.Text("voice.residents.weight.noise_dba"); got != old {
		t.Errorf("after undo %q", got)
	}
	if !p.found.takenBack[first.seq] || p.redo.Disabled() || !strings.Contains(p.redone.Text, title) {
		t.Errorf("taken back %v, redo says %q", p.found.takenBack, p.redone.Text)
	}
	if l := p.found.lines[p.found.shown[0]]; !strings.HasPrefix(l.what, "Took back change") {
		t.Errorf("%+v", l)
	}
	test.Tap(p.redo)
	b.Settle()
	b.Until("the redo is there", func() bool { return all() && !p.found.takenBack[first.seq] })
	test.Type(p.filter, "NOISE")
	b.Until("the filter holds", func() bool { return len(p.found.shown) < len(p.found.lines) })
	for _, i := range p.found.shown {
		if !strings.Contains(p.found.lines[i].search, "noise") {
			t.Errorf("%q passes", p.found.lines[i].what)
		}
	}
	p.filter.SetText("no such thing at all")
	b.Until("nothing passes", func() bool { return len(p.found.shown) == 0 })
}

func TestFrozen(t *testing.T) {
	b := open(t)
	b.s.tabs.Choose(2)
	p := b.s.frozen
	if !p.freeze.Disabled() {
		t.Error("a state without a name can be frozen")
	}
	// Asked for while it is out of date, it waits until it is computed.
	b.Core.Set("set", "r", study.SettingEdit{Key: "rule.setback.dwellings.wind_m", Value: "900"})
	b.Until("the edit is seen", func() bool { return !b.Core.View().Current })
	test.Type(p.name, "before the vote")
	test.Tap(p.freeze)
	b.Until("it is frozen", func() bool { return len(b.Core.View().Frozen) == 1 })
	f := b.Core.View().Frozen[0]
	if f.Name != "before the vote" || f.Code != b.Core.View().Results.Code.Check || p.name.Text != "" {
		t.Fatalf("%q with %q", f.Name, f.Code)
	}
	b.set("rule.setback.dwellings.wind_m", "1500")
	if b.Core.View().Results.Code.Check == f.Code {
		t.Fatal("the change changed nothing")
	}
	p.verify(f)
	b.idle()
	if text := lines(p.verdict.box); !strings.Contains(text, "Identical to the frozen state") || p.title.Text != f.Name {
		t.Errorf("found %q", text)
	}
	f.Code = strings.Repeat("0", 64)
	p.verify(f)
	b.idle()
	if text := lines(p.verdict.box); !strings.Contains(text, "Differs from the frozen state") || !strings.Contains(text, f.Code) {
		t.Errorf("found %q", text)
	}
	test.Type(p.name, "before the vote")
	test.Tap(p.freeze)
	b.Until("the second name is refused", func() bool { return b.Window.Canvas().Overlays().Top() != nil })
	if len(b.Core.View().Frozen) != 1 {
		t.Error("the name was used twice")
	}
}

func TestWords(t *testing.T) {
	parts, err := program.Load()
	if err != nil {
		t.Fatal(err)
	}
	s := newSpeaker(parts.Catalog, parts.Params)
	layer := func(c study.Change) string { c.Kind, c.Key = study.LayerRecKind, "Roads"; return s.change(c) }
	one := json.RawMessage(`{}`)
	for want, got := range map[string]string{
		"Layer Roads added":       layer(study.Change{New: one}),
		"Layer Roads replaced":    layer(study.Change{Old: one, New: one}),
		"Layer Roads taken out":   layer(study.Change{Old: one}),
		"Site North of 2 parcels": s.change(study.Change{Kind: study.GroupRecord, Key: "North", New: json.RawMessage(`{"site":"North","parcels":["a","b"]}`)}),
	} {
		if got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
	got := s.change(study.Change{Kind: study.SettingRecord, Key: "rule.setback.dwellings.wind_m", New: study.Canonical(study.Setting{Value: "900", Unit: "m"})})
	if !strings.Contains(got, "dwellings") || !strings.HasSuffix(got, ": default → 900 m") {
		t.Error(got)
	}
}

// The marks of the journal are those of the study itself, whatever is undone and redone.
func TestStandingIsThatOfTheStudy(t *testing.T) {
	b := open(t)
	st := b.Core.Session.Study()
	for i, do := range []string{"set", "set", "undo", "undo", "redo", "set", "undo", "redo", "undo"} {
		b.Core.Edit("step", func(ctx context.Context, s *study.Study) (err error) {
			switch do {
			case "undo":
				_, err = s.Undo(ctx)
			case "redo":
				_, err = s.Redo(ctx)
			default:
				_, err = s.Set(ctx, fmt.Sprint("set", i), "", study.SettingEdit{Key: "study.place", Value: fmt.Sprint(i)})
			}
			return err
		}, nil)
		b.Settle()
		undoVerb, redoVerb := st.Undoable()
		_, undo, redo := standing(st.Journal())
		for _, c := range []struct {
			seq  int64
			verb string
		}{{undo, undoVerb}, {redo, redoVerb}} {
			found := ""
			for _, e := range st.Journal() {
				if e.Seq == c.seq {
					found = e.Verb
				}
			}
			if found != c.verb {
				t.Fatalf("after step %d: entry %d is %q, the study says %q", i, c.seq, found, c.verb)
			}
		}
	}
}
