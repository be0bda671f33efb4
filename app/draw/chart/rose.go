package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// Rose is wind by the direction that it comes from.
type Rose struct {
	Title   string // for readers who cannot see the picture
	ID      string
	Sectors []RoseSector // evenly clockwise, the first around north
	Even    bool         // the even spread is assumed, not known
}

// RoseSector is one direction: shares of the whole year.
type RoseSector struct {
	Time, Energy float64
	WakeLoss     float64 // of the direction's energy
	SpeedMPerS   float64
}

// WindRose draws the shares of energy as filled wedges and those of time as their outlines, north up. Lengths
// measure; areas do not.
func WindRose(in Rose, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	most := 0.0
	for _, x := range in.Sectors {
		most = math.Max(most, math.Max(x.Time, x.Energy))
	}
	if most <= 0 {
		return s.nothing("The directions of the wind are unknown")
	}
	const radius, top = 104.0, 40.0
	a := newAxis(0, 100*most, 3, false)
	centre := draw.Point{X: s.Width / 2, Y: top + radius}
	at := func(percent float64) float64 { return radius * a.share(percent) }
	head := "share of the year by the direction the wind comes from"
	if in.Even {
		head = "share of the year by direction; an even spread is assumed"
	}
	s.write(pad, 18, draw.Fit(head, small, false, s.Width-2*pad), small, p.Faint, draw.Start)
	round := func(r float64) []draw.Point {
		const steps = 72
		ring := make([]draw.Point, steps)
		for k := range ring {
			sin, cos := math.Sincos(2 * math.Pi * float64(k) / steps)
			ring[k] = draw.Point{X: centre.X + r*sin, Y: centre.Y - r*cos}
		}
		return ring
	}
	for _, t := range a.ticks() {
		if t > 0 {
			s.Path(draw.Path{Rings: [][]draw.Point{round(at(t))}, Closed: true, Style: draw.Style{Stroke: p.Rule, Width: 1}})
		}
	}
	wedge := func(i int, percent, half float64) []draw.Point {
		const steps = 8
		ring := []draw.Point{centre}
		mid := 2 * math.Pi * float64(i) / float64(len(in.Sectors))
		for k := range steps + 1 {
			sin, cos := math.Sincos(mid + half*(2*float64(k)/steps-1))
			ring = append(ring, draw.Point{X: centre.X + at(percent)*sin, Y: centre.Y - at(percent)*cos})
		}
		return ring
	}
	each := math.Pi / float64(len(in.Sectors))
	for i, x := range in.Sectors {
		deg := 360 * float64(i) / float64(len(in.Sectors))
		words := fmt.Sprintf("%.0f°, %s: %.1f %% of the time, mean speed %.1f m/s, %.1f %% of the energy, wakes take %.1f %% of it", deg, Direction(deg), 100*x.Time, x.SpeedMPerS, 100*x.Energy, 100*x.WakeLoss)
		s.Path(draw.Path{Rings: [][]draw.Point{wedge(i, 100*x.Energy, 0.86*each)}, Closed: true, Style: draw.Style{Fill: p.Accent}, Item: fmt.Sprintf("sector-%d", i), Title: words})
		s.Path(draw.Path{Rings: [][]draw.Point{wedge(i, 100*x.Time, 0.86*each)}, Closed: true, Style: draw.Style{Stroke: p.Ink, Width: 1.2}})
	}
	for i, name := range []string{"N", "E", "S", "W"} {
		sin, cos := math.Sincos(math.Pi / 2 * float64(i))
		anchor := []draw.Anchor{draw.Middle, draw.Start, draw.Middle, draw.End}[i]
		s.write(centre.X+(radius+6)*sin, centre.Y-(radius+10)*cos+4, name, small, p.Ink, anchor)
	}
	y := centre.Y + radius + 26
	ticks := a.ticks()
	y += s.legend(y, []key{{style: draw.Style{Fill: p.Accent}, text: "energy"}, {style: draw.Style{Stroke: p.Ink, Width: 1.2}, text: "time"}, {line: true, style: draw.Style{Stroke: p.Rule, Width: 1}, text: fmt.Sprintf("rings every %s %%", a.label(ticks[1]-ticks[0]))}})
	return s.done(y + 4)
}
