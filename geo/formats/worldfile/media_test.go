package worldfile

import "testing"

// A place comes back from a media type to the last digit, and other types are no pictures.
func TestMediaKeepsThePlace(t *testing.T) {
	for _, w := range []World{{A: 0.1, D: 1e-7, B: -1e-7, E: -0.1 / 3, C: 500012.123456789, F: 5316862.5}, {A: 1e-9, E: -1e-9, C: -27.03, F: 47.5}} {
		for format, kind := range types {
			media := Info{Format: format, World: w}.Media()
			got, err := OfMedia(media)
			if err != nil || got == nil || *got != w || media[:len(kind)] != kind {
				t.Errorf("%s: %v, %v", media, got, err)
			}
		}
	}
	if w, err := OfMedia("image/tiff"); w != nil || err != nil {
		t.Errorf("%v, %v", w, err)
	}
	for _, media := range []string{"", "text/x-ascii-grid", "application/x-hgt", `image/png; world="1 2 3"`, `image/png; world="0 0 0 0 0 0"`, "image/webp"} {
		if _, err := OfMedia(media); err == nil {
			t.Errorf("%q is taken", media)
		}
	}
}
