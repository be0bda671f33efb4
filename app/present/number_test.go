package present

import (
	"testing"

	"groundtally/scoring"
)

func TestFigure(t *testing.T) {
	for _, c := range []struct {
		central, low, high float64
		want               string
	}{
		{8.4321, 6.1, 11.9, "8.4"},
		{12345.6, 12345.6, 12345.6, "12 300"},
		{12345.6, 11000, 13500, "12 300"},
		{0.034512, 0.03, 0.04, "0.035"},
		{0, 0, 0, "0"},
		{-1234.5, -1300, -1100, "-1230"},
		{9876, 9800, 9900, "9880"},
	} {
		if got := Figure(c.central, c.low, c.high); got != c.want {
			t.Errorf("Figure(%v, %v, %v) = %q, want %q", c.central, c.low, c.high, got, c.want)
		}
	}
}

func TestCellNeverShowsMissingAsZero(t *testing.T) {
	for _, s := range []scoring.State{scoring.Unknown, scoring.NotSet, scoring.None, scoring.Never, scoring.NotAssessed} {
		if got := Cell(scoring.Consequence{State: s}); got == "0" || got == "" {
			t.Errorf("state %v is shown as %q", s, got)
		}
	}
}
