// Package rows lays long rows of panels side by side in polygons.
package rows

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"groundtally/geo"
	"groundtally/geo/measure"
)

// Layout is how rows are laid. Lengths are in metres on the ground plan.
type Layout struct {
	AzimuthDeg float64 // from grid north: the way that rows face, square to which they run
	PitchM     float64 // from the middle of a row to that of the next
	DepthM     float64 // of a row, from front to back on the plan; at most the pitch
	UnitM      float64 // length that one unit takes along the row, a module or a table of them
	LeastUnits int     // the shortest run of units; 1 or more
	BlockM     float64 // length of blocks along the rows; 0 for no lanes across the rows
	LaneM      float64 // width of the lanes between blocks
	MostUnits  int     // ends the laying; 0 for no end
}

// Row is a run of units without a gap.
type Row struct {
	From, To geo.XY // ends of its middle line
	Units    int
}

// ErrLayout is wrapped by errors on a layout that cannot be laid.
var ErrLayout = errors.New("rows cannot be laid")

func (o Layout) check() error {
	for _, c := range []struct {
		what     string
		v        float64
		least    float64
		most     float64
		leastOut bool // least itself is out
	}{
		{"azimuth in degrees", o.AzimuthDeg, -720, 720, false},
		{"pitch in metres", o.PitchM, 0, 1000, true},
		{"depth in metres", o.DepthM, 0, o.PitchM, true},
		{"length of a unit in metres", o.UnitM, 0, 1000, true},
		{"fewest units", float64(o.LeastUnits), 1, 1e6, false},
		{"length of a block in metres", o.BlockM, 0, 1e5, false},
		{"width of a lane in metres", o.LaneM, 0, 1000, false},
		{"most units", float64(o.MostUnits), 0, math.MaxInt32, false},
	} {
		if !(c.v >= c.least && c.v <= c.most) || c.leastOut && c.v == c.least {
			return fmt.Errorf("%w: %s is %v", ErrLayout, c.what, c.v)
		}
	}
	return nil
}

// toleranceM lets a row lie along an edge in spite of rounding.
const toleranceM = 1e-6

// Lay fills polygons with rows. Each part is filled by itself, in the order given: rows begin at its edge on the
// far side, one pitch apart; a run takes as many units as have room between the edges over the whole depth of
// the row. Every rectangle of a row lies in the part, but for a micrometre. With blocks, lanes cross all rows of
// a part at the same places.
func Lay(area geo.XYGeometry, o Layout) ([]Row, error) {
	if err := o.check(); err != nil {
		return nil, err
	}
	if area.Kind != geo.Polygons && !area.Empty() {
		return nil, fmt.Errorf("%w: a %v has no room", ErrLayout, area.Kind)
	}
	// In the frame of the rows x runs along them and y towards where they face.
	sin, cos := math.Sincos(o.AzimuthDeg * math.Pi / 180)
	turn := func(p geo.XY) geo.XY {
		return geo.XY{X: float64(p.X*cos) - float64(p.Y*sin), Y: float64(p.X*sin) + float64(p.Y*cos)}
	}
	back := func(p geo.XY) geo.XY {
		return geo.XY{X: float64(p.X*cos) + float64(p.Y*sin), Y: float64(p.Y*cos) - float64(p.X*sin)}
	}
	var out []Row
	units := 0
	for _, part := range area.Parts {
		turned := make([][]geo.XY, len(part))
		for i, ring := range part {
			turned[i] = make([]geo.XY, len(ring))
			for k, p := range ring {
				if !p.Finite() {
					return nil, fmt.Errorf("%w: a position is not finite", ErrLayout)
				}
				turned[i][k] = turn(p)
			}
		}
		l := newLayer(turned)
		x := l.slicer.Extent()
		n := int(math.Floor((x.MaxY-x.MinY-o.DepthM+toleranceM)/o.PitchM)) + 1
		for k := range max(0, n) {
			y := x.MinY + o.DepthM/2 + float64(float64(k)*o.PitchM)
			for _, free := range l.free(y-o.DepthM/2, y+o.DepthM/2) {
				for _, run := range o.blocks(free, x.MinX) {
					m := int(math.Floor((run.Hi-run.Lo+toleranceM)/o.UnitM + 1e-9))
					if o.MostUnits > 0 {
						m = min(m, o.MostUnits-units)
					}
					if m < o.LeastUnits {
						continue
					}
					units += m
					out = append(out, Row{From: back(geo.XY{X: run.Lo, Y: y}), To: back(geo.XY{X: run.Lo + float64(float64(m)*o.UnitM), Y: y}), Units: m})
				}
			}
			if o.MostUnits > 0 && units >= o.MostUnits {
				return out, nil
			}
		}
	}
	return out, nil
}

// blocks cuts a free stretch by the lanes, which are counted from the part's edge.
func (o Layout) blocks(s measure.Span, from float64) []measure.Span {
	if o.BlockM == 0 || o.LaneM == 0 {
		return []measure.Span{s}
	}
	step := o.BlockM + o.LaneM
	var out []measure.Span
	for k := math.Floor((s.Lo - from) / step); ; k++ {
		lo := from + float64(k*step)
		if lo >= s.Hi {
			return out
		}
		if b := (measure.Span{Lo: math.Max(s.Lo, lo), Hi: math.Min(s.Hi, lo+o.BlockM)}); b.Hi > b.Lo {
			out = append(out, b)
		}
	}
}

// layer finds what is free over the depth of a row.
type layer struct {
	slicer *measure.Slicer
	ys     []float64 // heights of the corners, rising
}

func newLayer(part [][]geo.XY) *layer {
	l := &layer{slicer: measure.NewSlicer(geo.XYGeometry{Kind: geo.Polygons, Parts: [][][]geo.XY{part}})}
	for _, ring := range part {
		for _, p := range ring {
			l.ys = append(l.ys, p.Y)
		}
	}
	slices.Sort(l.ys)
	l.ys = slices.Compact(l.ys)
	return l
}

// free gives the stretches that lie in the part from one height to another. Between corners edges are straight,
// so that what is free at both ends of such a strip is free all through it.
func (l *layer) free(low, high float64) []measure.Span {
	at := []float64{low + toleranceM, high - toleranceM}
	from, _ := slices.BinarySearch(l.ys, low+2*toleranceM)
	for _, y := range l.ys[from:] {
		if y > high-2*toleranceM {
			break
		}
		at = append(at, y-toleranceM, y+toleranceM)
	}
	free := l.slicer.At(at[0], nil)
	for _, y := range at[1:] {
		free = both(free, l.slicer.At(y, nil))
	}
	return free
}

// both gives what lies in two lists of stretches, which are in order.
func both(a, b []measure.Span) (out []measure.Span) {
	for i, k := 0, 0; i < len(a) && k < len(b); {
		if s := (measure.Span{Lo: math.Max(a[i].Lo, b[k].Lo), Hi: math.Min(a[i].Hi, b[k].Hi)}); s.Hi > s.Lo {
			out = append(out, s)
		}
		if a[i].Hi < b[k].Hi {
			i++
		} else {
			k++
		}
	}
	return out
}

// Polygons gives the ground plans of rows.
func Polygons(rs []Row, depthM float64) geo.XYGeometry {
	out := geo.XYGeometry{Kind: geo.Polygons}
	for _, r := range rs {
		d := r.To.Sub(r.From)
		n := math.Hypot(d.X, d.Y)
		if n == 0 {
			continue
		}
		across := geo.XY{X: -d.Y / n * depthM / 2, Y: d.X / n * depthM / 2}
		a, b := geo.XY{X: r.From.X - across.X, Y: r.From.Y - across.Y}, geo.XY{X: r.To.X - across.X, Y: r.To.Y - across.Y}
		c, e := geo.XY{X: r.To.X + across.X, Y: r.To.Y + across.Y}, geo.XY{X: r.From.X + across.X, Y: r.From.Y + across.Y}
		out.Parts = append(out.Parts, [][]geo.XY{{a, b, c, e, a}})
	}
	return out
}
