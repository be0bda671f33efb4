package tiles

import (
	"bytes"
	"context"
	"fmt"
	"image"
	"image/color"
	"math/rand/v2"
	"runtime"
	"testing"
	"time"
)

// waitFor waits until done, or fails after a time that only a dead painter needs.
func waitFor(t testing.TB, what string, done func() bool) {
	t.Helper()
	for range 20_000 {
		if done() {
			return
		}
		time.Sleep(time.Millisecond)
	}
	t.Fatalf("waited in vain: %s", what)
}

func allFresh(p *Painter, keys []Key) func() bool {
	return func() bool {
		for _, k := range keys {
			if _, fresh := p.Picture(k); !fresh {
				return false
			}
		}
		return true
	}
}

func TestPicturesDoNotDependOnTheWorkers(t *testing.T) {
	g := mixed(t)
	keys := Keys(4, image.Rect(-600, -400, 600, 400))
	var pictures [2]map[Key]*image.RGBA
	for i, workers := range []int{1, 4} {
		p := NewPainter(Options{Workers: workers})
		p.SetStyle(Style{Look: DarkLook(), PixelRatio: 1.5})
		p.SetGround(g)
		p.SetMarks(someMarks())
		p.SetShading(everything(g.Parcels()))
		p.Want(keys)
		waitFor(t, "all tiles", allFresh(p, keys))
		pictures[i] = map[Key]*image.RGBA{}
		for _, k := range keys {
			pictures[i][k], _ = p.Picture(k)
		}
		p.Close()
	}
	for k, one := range pictures[0] {
		if !bytes.Equal(one.Pix, pictures[1][k].Pix) {
			t.Errorf("tile %v differs between one worker and four", k)
		}
	}
}

func TestShadingDrawsNothingAnew(t *testing.T) {
	g := mixed(t)
	p := NewPainter(Options{Workers: 2})
	defer p.Close()
	p.SetGround(g)
	keys := Keys(2, image.Rect(-512, -512, 512, 512))
	p.Want(keys)
	waitFor(t, "first pictures", allFresh(p, keys))
	before, _ := p.Picture(keys[0])
	old := bytes.Clone(before.Pix)
	others := keys[1:]
	drawn := p.Counts().Drawn
	p.SetShading(everything(g.Parcels()))
	waitFor(t, "new colours", allFresh(p, others))
	p.SetMarks(someMarks())
	waitFor(t, "marks", allFresh(p, others))
	waitFor(t, "all colours", func() bool { return p.Counts().Shaded >= drawn+2*len(keys) })
	if now := p.Counts().Drawn; now != drawn {
		t.Errorf("new colours drew %d tiles", now-drawn)
	}
	if !bytes.Equal(before.Pix, old) {
		t.Error("a picture was changed before a newer one was given out")
	}
	after, _ := p.Picture(keys[0])
	if bytes.Equal(after.Pix, old) {
		t.Error("the new colours do not show")
	}
	p.SetStyle(Style{Look: DarkLook()})
	if stale, fresh := p.Picture(keys[0]); stale == nil || fresh {
		t.Error("the old picture is not given out while the new one is drawn")
	}
	waitFor(t, "the dark look", allFresh(p, keys))
	if now := p.Counts().Drawn; now < drawn+len(keys) {
		t.Errorf("a new look drew %d tiles of %d", now-drawn, len(keys))
	}
}

// TestNewestShadingWins changes colours faster than they can be drawn.
func TestNewestShadingWins(t *testing.T) {
	g := mustGround(t, parcelCells(400))
	p := NewPainter(Options{Workers: 3})
	defer p.Close()
	p.SetGround(g)
	keys := Keys(4, image.Rect(-256, -256, 256, 256))
	p.Want(keys)
	r := rand.New(rand.NewPCG(3, 3))
	class := make([]uint8, g.Parcels())
	shown := map[Key]*image.RGBA{}
	var last color.NRGBA
	for i := range 300 {
		last = color.NRGBA{R: uint8(i), G: uint8(r.Uint32()), B: 9, A: 255}
		p.SetShading(Shading{Class: class, Colours: []color.NRGBA{last}})
		for _, k := range keys {
			shown[k], _ = p.Picture(k)
			if shown[k] != nil {
				_ = bytes.Clone(shown[k].Pix) // the race detector sees it when a picture in use is drawn over
			}
		}
		if i%40 == 0 {
			p.SetStyle(Style{Look: LightLook()})
		}
	}
	waitFor(t, "the last colours", allFresh(p, keys))
	middle, ok := g.Anchor(210)
	if !ok {
		t.Fatal("no anchor")
	}
	m := MPerPx(4)
	x, y := floor(middle.X/m), floor(-middle.Y/m)
	k := Key{4, floorDiv(x, SidePx), floorDiv(y, SidePx)}
	img, _ := p.Picture(k)
	if got := at(img, x-k.X*SidePx, y-k.Y*SidePx); got != last {
		t.Errorf("the parcel has the colour %v, not the last, %v", got, last)
	}
}

func TestMemoryIsBounded(t *testing.T) {
	g := mixed(t)
	const limit = 8 << 20
	p := NewPainter(Options{Workers: 2, MaxBytes: limit})
	defer p.Close()
	p.SetGround(g)
	var first []Key
	for step := range 12 {
		keys := Keys(0, image.Rect(step*256, 0, step*256+512, 512))
		if step == 0 {
			first = keys
		}
		p.Want(keys)
		waitFor(t, "tiles", allFresh(p, keys))
		c := p.Counts()
		if c.Bytes > limit {
			t.Fatalf("step %d: %d bytes kept, %d allowed", step, c.Bytes, limit)
		}
		if step > 6 && c.Bytes < limit/3 {
			t.Fatalf("step %d: only %d bytes kept", step, c.Bytes)
		}
	}
	if img, _ := p.Picture(first[0]); img != nil {
		t.Error("the tile used longest ago is still kept")
	}
	before := p.Counts()
	if before.Tiles < 5 || before.Tiles > 24 {
		t.Errorf("%d tiles kept", before.Tiles)
	}
}

// TestUnwantedWorkStops wants tiles of a heavy district and then others.
func TestUnwantedWorkStops(t *testing.T) {
	g := wide100k()
	p := NewPainter(Options{Workers: 2})
	defer p.Close()
	p.SetGround(g)
	overview := Keys(20, image.Rect(-800, -800, 800, 800))
	near := Keys(0, image.Rect(0, 0, 200, 200))
	cancelled := 0
	for range 200 {
		p.Want(overview)
		runtime.Gosched()
		p.Want(near)
		waitFor(t, "the near tiles", allFresh(p, near))
		if cancelled = p.Counts().Cancelled; cancelled > 3 {
			break
		}
	}
	if cancelled == 0 {
		t.Error("no drawing was stopped")
	}
	if c := p.Counts(); c.Tiles > len(near)+len(overview) {
		t.Errorf("%d tiles", c.Tiles)
	}
}

func TestPauseAndClose(t *testing.T) {
	before := runtime.NumGoroutine()
	g := mixed(t)
	readies := make(chan struct{}, 1000)
	p := NewPainter(Options{Workers: 4, Ready: func() { readies <- struct{}{} }})
	p.Pause()
	p.SetGround(g)
	keys := Keys(0, image.Rect(-256, -256, 256, 256))
	p.Want(keys)
	time.Sleep(20 * time.Millisecond)
	if c := p.Counts(); c.Drawn != 0 {
		t.Errorf("%d tiles drawn while pausing", c.Drawn)
	}
	p.Resume()
	waitFor(t, "tiles", allFresh(p, keys))
	for range keys {
		<-readies
	}
	p.SetGround(nil)
	if img, _ := p.Picture(keys[0]); img != nil {
		t.Error("a tile of the former district is still given out")
	}
	p.SetGround(wide100k())
	p.Want(Keys(20, image.Rect(-800, -800, 800, 800)))
	p.Close()
	waitFor(t, "the workers' end", func() bool { return runtime.NumGoroutine() <= before })
}

func BenchmarkNewGround(b *testing.B) {
	for _, n := range []int{10_000, 100_000} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			l := []Layer{parcelCells(n)}
			b.ResetTimer()
			for b.Loop() {
				mustGround(b, l...)
			}
		})
	}
}

// benchView is a view of 1,000 × 700 pixels that shows a district of n parcels whole, or close by.
func benchView(g *Ground, whole bool) []Key {
	level := 4
	if whole {
		for MPerPx(level)*900 < g.Extent().MaxX-g.Extent().MinX {
			level++
		}
	}
	return Keys(level, image.Rect(-500, -350, 500, 350))
}

func BenchmarkDraw(b *testing.B) {
	for _, n := range []int{10_000, 100_000} {
		g := wide100k()
		if n != 100_000 {
			g = mustGround(b, parcelCells(n))
		}
		for _, whole := range []bool{true, false} {
			name := map[bool]string{true: "overview", false: "close"}[whole]
			keys := benchView(g, whole)
			b.Run(fmt.Sprintf("%d/%s/1core", n, name), func(b *testing.B) {
				for b.Loop() {
					for _, k := range keys {
						if _, err := g.Draw(context.Background(), k.Level, k.Rect(), Style{Look: LightLook()}); err != nil {
							b.Fatal(err)
						}
					}
				}
			})
			b.Run(fmt.Sprintf("%d/%s/painter", n, name), func(b *testing.B) { paintAll(b, g, keys, func(p *Painter) { p.SetStyle(Style{Look: LightLook()}) }) })
		}
	}
}

func BenchmarkReshade(b *testing.B) {
	for _, n := range []int{10_000, 100_000} {
		g := wide100k()
		if n != 100_000 {
			g = mustGround(b, parcelCells(n))
		}
		s := everything(n)
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			paintAll(b, g, benchView(g, true), func(p *Painter) { p.SetShading(s) })
		})
	}
}

// paintAll measures how long it takes from a change until the last wanted tile is fresh.
func paintAll(b *testing.B, g *Ground, keys []Key, change func(*Painter)) {
	done := make(chan struct{}, 10_000)
	p := NewPainter(Options{Ready: func() { done <- struct{}{} }})
	defer p.Close()
	p.SetStyle(Style{Look: LightLook()})
	p.SetGround(g)
	p.SetShading(everything(g.Parcels()))
	p.Want(keys)
	for range keys {
		<-done
	}
	for b.Loop() {
		change(p)
		for range keys {
			<-done
		}
	}
}
