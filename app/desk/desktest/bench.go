package desktest

import (
	"context"
	"fmt"
	"image"
	"image/png"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"sync"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/files"
	"groundtally/app/live"
	"groundtally/app/program"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/app/study/studytest"
	"groundtally/geo"
	"groundtally/sampledata"
)

// Bench is a window under test. What other goroutines hand to the window waits until the test lets it
// through, so that tests see states one after the other.
type Bench struct {
	T      testing.TB
	App    fyne.App
	Window fyne.Window
	Core   *core.Core
	Theme  *theme.Theme
	Queue
}

// Queue holds what other goroutines hand to the window until the test lets it through.
type Queue struct {
	// Longest is the processor time of the longest call that was let through.
	Longest time.Duration

	mu    sync.Mutex
	queue []func()
}

// Call runs something as the toolkit would on the window's goroutine, and takes its time.
func (q *Queue) Call(f func()) {
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	from := threadTime()
	f()
	q.Longest = max(q.Longest, threadTime()-from)
}

// Do is the queue's end for other goroutines.
func (q *Queue) Do(f func()) {
	q.mu.Lock()
	defer q.mu.Unlock()
	q.queue = append(q.queue, f)
}

// Pump lets through what waits for the window; it tells whether there was anything.
func (q *Queue) Pump() bool {
	any := false
	for {
		q.mu.Lock()
		list := q.queue
		q.queue = nil
		q.mu.Unlock()
		if len(list) == 0 {
			return any
		}
		any = true
		for _, f := range list {
			q.Call(f)
		}
	}
}

// Parts are what the program stands on, read once for all tests.
var Parts = sync.OnceValues(program.Load)

// New opens a window on the sample study with every n-th of its parcels, in memory.
func New(t testing.TB, every int) *Bench {
	t.Helper()
	parts, err := Parts()
	if err != nil {
		t.Fatal(err)
	}
	return Over(t, Sample(t, parts, every))
}

// Over opens a window on a store.
func Over(t testing.TB, store study.Store) *Bench {
	t.Helper()
	parts, err := Parts()
	if err != nil {
		t.Fatal(err)
	}
	b := &Bench{T: t, App: test.NewTempApp(t), Theme: theme.New(theme.Light)}
	b.App.Settings().SetTheme(b.Theme)
	b.Window = test.NewTempWindow(t, nil)
	b.Window.SetPadded(false)
	b.Core = core.New(b.App, b.Window, parts, b.Theme)
	b.Core.Do, b.Core.Always = b.Queue.Do, b.Queue.Do
	s, err := live.Start(context.Background(), store, live.Config{Catalog: parts.Catalog, Params: parts.Params, Who: "Tester", Clock: clock(), Notify: func() { b.Queue.Do(b.Core.Update) }})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = s.Close() })
	b.Core.Attach(s)
	return b
}

// clock gives times that do not depend on when the test runs.
func clock() func() time.Time {
	var mu sync.Mutex
	at := time.Date(2031, 5, 3, 14, 32, 0, 0, time.UTC)
	return func() time.Time {
		mu.Lock()
		defer mu.Unlock()
		at = at.Add(time.Second)
		return at
	}
}

// samples are the studies made so far by this test binary, computed.
var samples = struct {
	sync.Mutex
	by map[int]*studytest.Store
}{by: map[int]*studytest.Store{}}

// Sample is the sample study with every n-th of its parcels, in memory, with its step results. It is made
// and computed once; every call gives a copy of its own.
func Sample(t testing.TB, parts *program.Parts, every int) study.Store {
	t.Helper()
	samples.Lock()
	defer samples.Unlock()
	store := samples.by[every]
	if store == nil {
		store = studytest.New()
		Fill(t, parts, store, every)
		s, err := study.Open(context.Background(), store, parts.Catalog, study.Options{Clock: clock()})
		if err != nil {
			t.Fatal(err)
		}
		snap, err := s.Snapshot()
		if err != nil {
			t.Fatal(err)
		}
		e := &run.Engine{Params: parts.Params, Cache: store, Load: run.StoreLoader(store)}
		if _, err := e.Compute(context.Background(), snap); err != nil {
			t.Fatal(err)
		}
		samples.by[every] = store
	}
	return store.Clone()
}

// Fill puts the sample study with every n-th of its parcels into a store.
func Fill(t testing.TB, parts *program.Parts, store study.Store, every int) {
	t.Helper()
	s, err := study.Open(context.Background(), store, parts.Catalog, study.Options{Clock: clock()})
	if err != nil {
		t.Fatal(err)
	}
	tools, done := files.NewTools()
	defer done()
	read := func(ctx context.Context, fsys fs.FS, name string) (study.Import, error) {
		in, err := files.ImportFS(ctx, fsys, name)
		if err == nil && name == "parcels.geojson" {
			var few []geo.Feature
			for i, f := range in.Layer.Features {
				if i%every == 0 {
					few = append(few, f)
				}
			}
			in.Layer.Features = few
		}
		return in, err
	}
	if err := s.LoadSample(context.Background(), sampledata.FS(), read, tools, func(study.LayerRecord) {}); err != nil {
		t.Fatal(err)
	}
}

// Until pumps until something holds; it fails the test when it does not hold within two minutes.
func (b *Bench) Until(what string, holds func() bool) {
	b.T.Helper()
	for end := time.Now().Add(2 * time.Minute); ; {
		b.Pump()
		if holds() {
			return
		}
		if time.Now().After(end) {
			b.T.Fatalf("waited in vain until %s", what)
		}
		time.Sleep(2 * time.Millisecond)
	}
}

// Settle pumps until the study is saved, computed and weighed.
func (b *Bench) Settle() {
	b.T.Helper()
	saved := false
	b.Core.Session.Edit(func(context.Context, *study.Study) error { return nil }, func(error) { b.Queue.Do(func() { saved = true }) })
	b.Until("the study is saved", func() bool { return saved })
	b.Until("the study is computed", func() bool {
		v := b.Core.View()
		_, working := b.Core.Session.Work()
		return !working && (v.Current || v.Problem != nil || v.Stopped)
	})
	b.Until("the order is there", func() bool {
		v, r := b.Core.View(), b.Core.Ranking()
		return !v.Current || v.Board == nil || len(v.Board.Keys) == 0 || r != nil && r.Board == v.Board && r.Voice == b.Core.Voice()
	})
}

// Show puts something into the window at a size.
func (b *Bench) Show(o fyne.CanvasObject, width, height float32) {
	b.Window.SetContent(o)
	b.Window.Resize(fyne.NewSize(width, height))
	b.Pump()
}

// Shoot takes pictures of the window in both themes. They are kept as artefacts of the test, in the
// folder .build/shots of the checkout.
func (b *Bench) Shoot(name string) (light, dark image.Image) {
	b.T.Helper()
	shots := make([]image.Image, 2)
	for i, mode := range []theme.Mode{theme.Light, theme.Dark} {
		*b.Theme = *theme.New(mode)
		b.App.Settings().SetTheme(b.Theme)
		b.Core.Emit(core.LookChanged)
		b.Pump()
		shots[i] = b.Window.Canvas().Capture()
		Save(b.T, fmt.Sprintf("%s-%s.png", name, mode), shots[i])
	}
	*b.Theme = *theme.New(theme.Light)
	b.App.Settings().SetTheme(b.Theme)
	b.Core.Emit(core.LookChanged)
	b.Pump()
	return shots[0], shots[1]
}

// Save keeps a picture as an artefact of the test, in the folder .build/shots of the checkout.
func Save(t testing.TB, name string, img image.Image) {
	t.Helper()
	dir, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	for {
		if _, err := os.Stat(filepath.Join(dir, "go.mod")); err == nil {
			break
		}
		up := filepath.Dir(dir)
		if up == dir {
			t.Fatal("the test does not run within the checkout")
		}
		dir = up
	}
	dir = filepath.Join(dir, ".build", "shots")
	if err := os.MkdirAll(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	f, err := os.Create(filepath.Join(dir, name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if err := png.Encode(f, img); err != nil {
		t.Fatal(err)
	}
}
