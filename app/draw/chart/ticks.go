package chart

import (
	"math"
	"strconv"
	"strings"

	"groundtally/app/draw"
)

// axis is a scale with its ticks.
type axis struct {
	lo, hi   float64
	step     float64
	decimals int
}

// newAxis finds round ends and round ticks around a range, with about so many steps. A quantity that is
// counted in whole numbers has none between them.
func newAxis(lo, hi float64, steps int, whole bool) axis {
	if !(hi > lo) {
		d := math.Abs(lo) / 10
		if d == 0 || whole {
			d = 1
		}
		lo, hi = lo-d, hi+d
		if lo < 0 && lo+d >= 0 { // what cannot be negative does not look so
			lo = 0
		}
	}
	rough := (hi - lo) / float64(max(1, steps))
	power := math.Pow(10, math.Floor(math.Log10(rough)))
	step := 10 * power
	for _, m := range []float64{1, 2, 5} {
		if m*power >= rough*(1-1e-9) {
			step = m * power
			break
		}
	}
	if whole {
		step = math.Max(1, step)
	}
	a := axis{step: step, decimals: int(math.Max(0, -math.Floor(math.Log10(step)+1e-9)))}
	a.lo, a.hi = math.Floor(lo/step+1e-9)*step, math.Ceil(hi/step-1e-9)*step
	return a
}

// ticks gives the values of the ticks.
func (a axis) ticks() []float64 {
	var out []float64
	for i := math.Ceil(a.lo/a.step - 1e-6); i <= math.Floor(a.hi/a.step+1e-6); i++ {
		out = append(out, a.step*i)
	}
	return out
}

// tightened takes away most of what the round ends of an axis leave empty, as long as two ticks remain.
func (a axis) tightened(lo, hi float64) axis {
	edge := (hi - lo) / 25
	b := a
	b.lo, b.hi = math.Max(a.lo, lo-edge), math.Min(a.hi, hi+edge)
	if !(hi > lo) || len(b.ticks()) < 2 {
		return a
	}
	return b
}

func (a axis) label(v float64) string { return number(v, a.decimals) }

// share gives where a value lies, from 0 to 1.
func (a axis) share(v float64) float64 {
	return math.Max(0, math.Min(1, (v-a.lo)/(a.hi-a.lo)))
}

// levelAxis makes an axis whose labels have room side by side.
func levelAxis(lo, hi, room float64, whole bool) axis {
	for steps := 6; ; steps-- {
		a := newAxis(lo, hi, steps, whole)
		widest, ticks := 0.0, a.ticks()
		for _, t := range ticks {
			widest = math.Max(widest, draw.TextWidth(a.label(t), small, false))
		}
		if steps == 1 || room/float64(max(1, len(ticks)-1)) >= widest+gap {
			return a
		}
	}
}

// band is a stretch of height.
type band struct{ top, bottom float64 }

// levelTicks draws upright guide lines within bands, beside which no text stands, with their labels below.
func (s *sheet) levelTicks(a axis, x, width, bottom float64, bands ...band) {
	for _, t := range a.ticks() {
		at := x + width*a.share(t)
		for _, b := range bands {
			s.line(s.p.Rule, 1, at, b.top, at, b.bottom)
		}
		label := a.label(t)
		half := draw.TextWidth(label, small, false) / 2
		s.write(math.Max(2+half, math.Min(at, s.Width-2-half)), bottom+16, label, small, s.p.Faint, draw.Middle)
	}
}

// number writes a number with thousands apart by a blank from five digits on.
func number(x float64, decimals int) string {
	text := strconv.FormatFloat(math.Abs(x), 'f', decimals, 64)
	sign := ""
	if x < 0 && strings.Trim(text, "0.") != "" {
		sign = "−"
	}
	whole, rest, dot := strings.Cut(text, ".")
	if len(whole) > 4 {
		for i := len(whole) - 3; i > 0; i -= 3 {
			whole = whole[:i] + " " + whole[i:]
		}
	}
	if dot {
		whole += "." + rest
	}
	return sign + whole
}

// figure writes a number to three digits, with all digits before the point.
func figure(x float64) string {
	if x == 0 || math.IsNaN(x) || math.IsInf(x, 0) {
		return "0"
	}
	return number(x, min(6, max(0, 2-int(math.Floor(math.Log10(math.Abs(x)))))))
}

// signed writes a number with its sign; nothing has none.
func signed(x float64, decimals int) string {
	text := number(x, decimals)
	if x > 0 && strings.Trim(text, "0.") != "" {
		return "+" + text
	}
	return text
}
