package svg_test

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/svg"
)

var length = regexp.MustCompile(` textLength="([0-9.]+)"`)

// A browser without the shipped typeface must set a text as wide as the scene reckons with. Letters that the
// typeface lacks are only estimated, so such a text keeps its own width.
func TestTextKeepsItsWidthInAnyTypeface(t *testing.T) {
	for _, c := range []struct {
		text  string
		bold  bool
		width float64
	}{{"Hollin Road 4", false, draw.TextWidth("Hollin Road 4", 12, false)}, {"≥ 40 dB(A)", true, draw.TextWidth("≥ 40 dB(A)", 12, true)}, {" two   blanks ", false, draw.TextWidth("two blanks", 12, false)}, {"日本", false, 0}, {"", false, 0}} {
		s := &draw.Scene{Width: 300, Height: 20}
		s.Text(draw.Text{At: draw.Point{X: 5, Y: 15}, Text: c.text, Size: 12, Colour: draw.Ink, Bold: c.bold})
		out := string(svg.Write(s))
		m := length.FindStringSubmatch(out)
		if c.width == 0 {
			if m != nil {
				t.Errorf("%q is given a width of %s that nobody knows", c.text, m[1])
			}
			continue
		}
		if m == nil {
			t.Errorf("%q has no width: %s", c.text, out)
			continue
		}
		if got, err := strconv.ParseFloat(m[1], 64); err != nil || math.Abs(got-c.width) > 0.06 {
			t.Errorf("%q is %s wide, want %v", c.text, m[1], c.width)
		}
	}
}

func TestFirstTypefaceIsTheShippedOne(t *testing.T) {
	if out := string(svg.Write(&draw.Scene{Width: 1, Height: 1})); !strings.Contains(out, `font-family="Lato, sans-serif"`) {
		t.Errorf("another typeface comes first: %s", out)
	}
}

// A closed shape without paint, such as a row that answers to the pointer, must be felt inside too.
func TestUnpaintedRowsAnswerToThePointer(t *testing.T) {
	for fill, want := range map[string]bool{"": true, draw.Ink: false} {
		s := &draw.Scene{Width: 10, Height: 10}
		s.Rect(1, 1, 5, 5, draw.Style{Fill: fill}, "a row")
		if got := strings.Contains(string(svg.Write(s)), `pointer-events="all"`); got != want {
			t.Errorf("fill %q: pointer-events is there: %v", fill, got)
		}
	}
}

func ExampleWrite() {
	s := &draw.Scene{Width: 20, Height: 10, Title: "a box"}
	s.Rect(0, 0, 20, 10, draw.Style{Fill: draw.Paper}, "")
	fmt.Println(string(svg.Write(s)))
	// Output: <svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 20 10" role="img" aria-label="a box" font-family="Lato, sans-serif" font-kerning="none"><path d="M0 0L20 0L20 10L0 10Z" fill="#fbf9f4" fill-rule="evenodd"/></svg>
}
