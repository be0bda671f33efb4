package plant

import "testing"

// What the window's goroutine does when the study changed.
func BenchmarkShow(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	s.tabs.Choose(2)
	s.choose("wind")
	for b.Loop() {
		s.show()
	}
}

func BenchmarkChooseAnother(b *testing.B) {
	_, s := open(b, 60, 760, 560)
	s.tabs.Choose(2)
	for b.Loop() {
		s.choose("wind")
		s.choose("solar_fixed")
	}
}
