package chart_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
)

// horizon is a hill in the south-west, unknown beyond the north-east for odd n.
func horizon(n int) chart.Horizon {
	in := chart.Horizon{Title: "horizon", ID: "-h"}
	for i := range 72 {
		v := math.Max(0, 6-math.Abs(float64(i)-45)/2)
		in.Angles = append(in.Angles, &v)
	}
	if n%2 == 1 {
		for i := 5; i < 15; i++ {
			in.Angles[i] = nil
		}
	}
	return in
}

// Every direction has its bar with words of its own, unknown ones are hatched, and the four sides are marked where
// they lie.
func TestHorizonStrip(t *testing.T) {
	for _, n := range []int{0, 1} {
		s := chart.HorizonStrip(horizon(n), draw.Light(), 760)
		at := map[string][]float64{}
		var words []string
		hatched, highest, highestAt := 0, math.Inf(1), ""
		for _, item := range s.Items {
			switch x := item.(type) {
			case draw.Text:
				at[x.Text] = append(at[x.Text], x.At.X)
			case draw.Path:
				if x.Title == "" {
					continue
				}
				words = append(words, x.Title)
				if x.Style.Hatch {
					hatched++
				} else if y := x.Rings[0][0].Y; y < highest {
					highest, highestAt = y, x.Title
				}
			}
		}
		if len(words) != 73 || len(slices.Compact(slices.Sorted(slices.Values(words)))) != 72 || hatched != 10*n {
			t.Errorf("%d bars, %d hatched", len(words), hatched)
		}
		if !strings.HasPrefix(highestAt, "225°, south-west: 6.0° above level") {
			t.Errorf("the highest is %q", highestAt)
		}
		if x := at["N"]; len(x) != 2 || len(at["E"]) != 1 || !(x[0] < at["E"][0] && at["E"][0] < at["S"][0] && at["S"][0] < at["W"][0] && at["W"][0] < x[1]) {
			t.Errorf("the sides are at %v", at)
		}
	}
	if s := chart.HorizonStrip(chart.Horizon{}, draw.Light(), 400); len(s.Items) == 0 {
		t.Error("without angles nothing is said")
	}
}

func TestDirection(t *testing.T) {
	for deg, want := range map[float64]string{0: "north", 359: "north", 22.4: "north", 22.6: "north-east", 90: "east", 225: "south-west", 315: "north-west", 360: "north"} {
		if got := chart.Direction(deg); got != want {
			t.Errorf("%g° is %s, want %s", deg, got, want)
		}
	}
}
