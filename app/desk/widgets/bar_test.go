package widgets

import (
	"testing"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/test"
)

// Hatching means unknown and nothing else: a bar that was never set, or was cleared, has none.
func TestHatchingMeansUnknown(t *testing.T) {
	test.NewTempApp(t)
	hatched := func(b *RangeBar) bool {
		for _, o := range test.WidgetRenderer(b).Objects() {
			if h, ok := o.(*Hatch); ok {
				return h.Visible()
			}
		}
		return false
	}
	b := NewRangeBar()
	b.Resize(fyne.NewSize(80, 8))
	if hatched(b) {
		t.Error("a new bar is hatched")
	}
	b.Clear()
	if hatched(b) {
		t.Error("a cleared bar is hatched")
	}
	b.SetUnknown()
	if !hatched(b) {
		t.Error("unknown is not hatched")
	}
	b.Set(0.1, 0.2, 0.3, false)
	if hatched(b) {
		t.Error("a number is hatched")
	}
}
