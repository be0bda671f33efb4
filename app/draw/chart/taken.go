package chart

import (
	"fmt"
	"math"

	"groundtally/app/draw"
)

// Land is the area of a site with what the rules take of it.
type Land struct {
	Title       string // for readers who cannot see the picture
	ID          string // tells its hatching from that of other pictures on one page
	GrossHa     float64
	BuildableHa float64
	Rules       []TakenRule
	SharedHa    float64 // taken by several rules, each hectare counted once
	ShapeHa     float64 // left over by the rules, but too small or too narrow
}

// TakenRule is what one rule takes.
type TakenRule struct {
	Item     string
	Name     string
	AloneHa  float64 // only this rule takes it
	SharedHa float64 // others take it too
	TakesAll bool
	Unknown  bool // the rule is not set or its layer is missing
}

// TakenBars draws how a site's gross area comes down to what can be built on: what each rule takes alone,
// what several take, what is too small or too narrow.
func TakenBars(in Land, p draw.Palette, width float64) *draw.Scene {
	s := newSheet(width, in.Title, in.ID, p)
	wide := s.Width >= 560
	left, right := pad, s.Width-pad
	if wide {
		longest := draw.TextWidth(shapeWords, small, false)
		for _, r := range in.Rules {
			longest = math.Max(longest, draw.TextWidth(r.Name, body, false))
		}
		left, right = s.column(longest, 0.2, 0.45), s.Width-pad-84
	}
	a := levelAxis(0, math.Max(in.GrossHa, 0.01), right-left, false)
	a = a.tightened(0, in.GrossHa)
	at := func(ha float64) float64 { return left + (right-left)*a.share(ha) }
	type bar struct {
		item, name, remark string
		from, to           float64
		fill               string
		strong, unknown    bool
	}
	rows := []bar{{name: "whole site", to: in.GrossHa, fill: p.Ramp(0.12), strong: true}}
	rest := in.GrossHa
	take := func(b bar, ha float64) {
		b.from, b.to = math.Max(0, rest-ha), rest
		rest = b.from
		rows = append(rows, b)
	}
	anyUnknown := false
	for _, r := range in.Rules {
		b := bar{item: r.Item, name: r.Name, fill: p.Ramp(0.55), unknown: r.Unknown}
		anyUnknown = anyUnknown || r.Unknown
		switch {
		case r.Unknown:
			b.remark = "unknown, so it takes nothing here"
		case r.TakesAll:
			b.remark = "takes the whole site by itself"
		case r.SharedHa > 0:
			b.remark = "alone; " + hectares(r.SharedHa) + " ha more with other rules"
		case r.AloneHa > 0:
			b.remark = "alone"
		}
		take(b, r.AloneHa)
	}
	if in.SharedHa > 0 {
		take(bar{name: "several rules together", remark: "each hectare counted once", fill: p.Ramp(0.35)}, in.SharedHa)
	}
	if in.ShapeHa > 0 {
		take(bar{name: "too small or too narrow", remark: shapeWords, fill: p.Ramp(0.35)}, in.ShapeHa)
	}
	rows = append(rows, bar{name: "buildable area", to: in.BuildableHa, fill: p.Accent, strong: true})

	heights := make([]float64, len(rows))
	y := pad - 4
	top := y
	for i, r := range rows {
		heights[i] = 26
		if !wide {
			heights[i] += 16
		}
		if r.remark != "" {
			heights[i] += lineHeight
		}
		y += heights[i]
	}
	bottom := y
	bands := []band{{top, bottom}}
	if !wide {
		bands = bands[:0]
		for i, at := 0, top; i < len(heights); i++ {
			at += heights[i]
			bands = append(bands, band{at - 20, at - 1})
		}
	}
	s.levelTicks(a, left, right-left, bottom, bands...)
	y = top
	for i, r := range rows {
		value := hectares(r.to-r.from) + " ha"
		if r.unknown {
			value = "unknown"
		}
		words := r.name + ": " + value
		if r.remark != "" {
			words += ", " + r.remark
		}
		s.hover(y, heights[i], r.item, words)
		room, barAt := left-pad-gap, y+4
		if !wide {
			room, barAt = s.Width-2*pad-gap-draw.TextWidth(value, body, r.strong), y+heights[i]-18
		}
		s.Text(draw.Text{At: draw.Point{X: pad, Y: y + 15}, Text: draw.Fit(r.name, body, r.strong, room), Size: body, Colour: p.Ink, Bold: r.strong})
		s.Text(draw.Text{At: draw.Point{X: s.Width - pad, Y: y + 15}, Text: value, Size: body, Colour: p.Ink, Bold: r.strong, Anchor: draw.End})
		if r.remark != "" {
			if !wide {
				room = s.Width - 2*pad
			}
			s.write(pad, y+29, draw.Fit(r.remark, small, false, room), small, p.Faint, draw.Start)
		}
		x0, x1 := at(r.from), at(r.to)
		st := draw.Style{Fill: r.fill}
		if r.unknown {
			st, x0 = s.unknown(), math.Max(left, x1-12)
		} else if x1-x0 < 1 && r.to > r.from {
			x0 = x1 - 1
		}
		if x1 > x0 {
			s.Bar(x0, barAt, x1-x0, 15, st, r.item, words)
		}
		y += heights[i]
	}
	foot := s.centred((left+right)/2, bottom+33, math.Max(right-left, 200), "area, ha")
	y = bottom + 33 + foot
	if anyUnknown {
		y += s.legend(y-6, []key{{style: s.unknown(), text: "unknown: not set, or without its layer"}})
	}
	return s.done(y)
}

const shapeWords = "what the rules leave, but no room in it"

func hectares(x float64) string { return fmt.Sprintf("%.2f", math.Max(0, x)) }
