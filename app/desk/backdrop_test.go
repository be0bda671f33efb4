package desk

import (
	"fmt"
	"image"
	"image/color"
	"image/jpeg"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/storage"
	"fyne.io/fyne/v2/test"
	"fyne.io/fyne/v2/widget"

	"groundtally/app/desk/desktest"
	"groundtally/app/study"
	"groundtally/geo/crs"
)

// aerial writes an invented picture of fields, woods and ways over the sample district, with its world file.
func aerial(t testing.TB, v *study.Snapshot) string {
	t.Helper()
	to, err := crs.NewTransform("EPSG:32626")
	if err != nil {
		t.Fatal(err)
	}
	x, y, err := to.Inverse(*v.Frame)
	if err != nil {
		t.Fatal(err)
	}
	const side, pixelM = 1600, 12.0
	img := image.NewRGBA(image.Rect(0, 0, side, side))
	for r := range side {
		for c := range side {
			u, w := float64(c)/60, float64(r)/45
			field := math.Sin(math.Floor(u+math.Sin(w/3))*12.9898+math.Floor(w)*78.233) * 0.5
			base := [3]float64{120 + 60*field, 125 + 45*field, 70 + 30*field}
			if math.Sin(float64(c)/140)*math.Cos(float64(r)/170) > 0.45 {
				base = [3]float64{35, 55, 30} // a wood
			}
			if math.Abs(math.Mod(float64(c)+0.4*float64(r), 230)-8) < 2.5 || math.Abs(math.Mod(float64(r)-0.3*float64(c)+2000, 310)-8) < 2 {
				base = [3]float64{215, 205, 190} // a way
			}
			img.SetRGBA(c, r, color.RGBA{R: uint8(base[0]), G: uint8(base[1]), B: uint8(base[2]), A: 255})
		}
	}
	path := filepath.Join(t.TempDir(), "Summer flight.jpg")
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if err := jpeg.Encode(f, img, nil); err != nil {
		t.Fatal(err)
	}
	world := fmt.Sprintf("%g\n0\n0\n%g\n%f\n%f\n", pixelM, -pixelM, x-side/2*pixelM, y+side/2*pixelM)
	if err := os.WriteFile(strings.TrimSuffix(path, ".jpg")+".jgw", []byte(world), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// shown tells whether a text of the canvas is seen in the window.
func (s *stand) shown(words string) bool {
	for _, o := range test.LaidOutObjects(s.w.window.Canvas().Content()) {
		if x, ok := o.(*canvas.Text); ok && x.Visible() && strings.Contains(x.Text, words) {
			return true
		}
	}
	return false
}

// A picture that is dropped on the window is asked about, drawn under the parcels with those who must be named,
// and goes when it is switched off or taken back.
func TestBackdrop(t *testing.T) {
	s := open(t, 6)
	if s.w.picture.under.Visible() {
		t.Error("a study without a picture offers to show it")
	}
	differ := func(a, b image.Image) int {
		n, box := 0, s.w.picture.m.Size()
		at := fyne.CurrentApp().Driver().AbsolutePositionForObject(s.w.picture.m)
		for y := int(at.Y) + 100; y < int(at.Y+box.Height)-100; y += 3 {
			for x := int(at.X) + 60; x < int(at.X+box.Width)-60; x += 3 {
				if a.At(x, y) != b.At(x, y) {
					n++
				}
			}
		}
		return n
	}
	pixels := func() image.Image { // relief and surroundings come after the ground
		s.settle()
		last, since := s.w.window.Canvas().Capture(), time.Now()
		s.until("the map stays as it is", func() bool {
			now := s.w.window.Canvas().Capture()
			if !s.w.picture.m.Settled() || differ(last, now) > 0 {
				last, since = now, time.Now()
			}
			return time.Since(since) > time.Second
		})
		return last
	}
	before := pixels()
	path := aerial(t, s.w.core.View().Snap)
	s.w.dropped(fyne.Position{}, []fyne.URI{storage.NewFileURI(path)})
	s.until("the form is open", func() bool { return s.w.state().Over > 0 })
	desktest.Save(t, "backdrop-form-light.png", s.w.window.Canvas().Capture())
	press := func(text string) {
		t.Helper()
		for _, o := range test.LaidOutObjects(s.w.window.Canvas().Overlays().Top()) {
			if x, ok := o.(*widget.Button); ok && x.Text == text {
				test.Tap(x)
				s.Pump()
				return
			}
		}
		t.Fatalf("there is no button %q", text)
	}
	fill := func(hint, text string) {
		t.Helper()
		for _, o := range test.LaidOutObjects(s.w.window.Canvas().Overlays().Top()) {
			if x, ok := o.(*widget.Entry); ok && strings.HasPrefix(x.PlaceHolder, hint) {
				x.SetText(text)
				return
			}
		}
		t.Fatalf("there is no field %q", hint)
	}
	fill("as EPSG", "EPSG:32626")
	press("Add")
	said := ""
	for _, o := range test.LaidOutObjects(s.w.window.Canvas().Overlays().Top()) {
		if x, ok := o.(*widget.Label); ok {
			said += x.Text + "\n"
		}
	}
	if !strings.Contains(said, "Who must be named") {
		t.Errorf("without anybody to name, the form says %q", said)
	}
	fill("needed; as", "© Survey office of Marram 2031")
	press("Add")
	s.until("the picture is in the study", func() bool { return len(s.w.core.View().Snap.LayersOf(study.BackdropRole)) == 1 })
	s.until("it is drawn", func() bool { return s.shown("© Survey office of Marram 2031") })
	rec := s.w.core.View().Snap.LayersOf(study.BackdropRole)[0]
	if rec.Credit().Attribution != "© Survey office of Marram 2031" || rec.CRS != "EPSG:32626" || rec.Name != "Summer flight" {
		t.Errorf("%+v", rec)
	}
	s.shoot("backdrop")
	with := pixels()
	if n := differ(before, with); n < 3000 {
		t.Errorf("the picture changes %d places of the map", n)
	}
	if !s.w.picture.under.Visible() {
		t.Fatal("there is no switch")
	}
	s.w.picture.under.SetChecked(false)
	without := pixels()
	if n := differ(before, without); n != 0 || s.shown("© Survey") {
		t.Errorf("switched off, it still changes %d places; named: %t", n, s.shown("© Survey"))
	}
	s.w.picture.under.SetChecked(true)
	s.until("it is drawn again", func() bool { return s.shown("© Survey office") })
	if n := differ(with, pixels()); n != 0 {
		t.Errorf("switched on again, %d places are others than before", n)
	}
	s.w.core.Undo()
	s.until("it is gone", func() bool { return !s.w.picture.under.Visible() && !s.shown("© Survey") })
	if n := differ(before, pixels()); n != 0 {
		t.Errorf("taken back, it still changes %d places", n)
	}
}
