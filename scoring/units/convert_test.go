package units

import "testing"

func TestConvert(t *testing.T) {
	for _, c := range []struct {
		x        float64
		from, to string
		want     float64
	}{{20000, "V", "kV", 20}, {3, "MW", "kW", 3000}, {36, "km/h", "m/s", 10}, {100, "ft", "m", 30.48}, {7, "", "", 7}} {
		got, err := Convert(c.x, c.from, c.to)
		if err != nil || got < c.want-1e-12 || got > c.want+1e-12 {
			t.Errorf("%v %s in %s: got %v, %v, want %v", c.x, c.from, c.to, got, err, c.want)
		}
	}
	if _, err := Convert(1, "kV", "m"); err == nil {
		t.Error("volts were brought to metres")
	}
}
