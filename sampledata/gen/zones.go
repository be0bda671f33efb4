package gen

import (
	"math"

	"groundtally/geo"
)

// zone is one patch of a class: an outer ring that turns left and its holes.
type zone struct {
	class int
	outer []geo.XY
	holes [][]geo.XY
}

// zones classes the plane cell by cell and gives the patches of equal class as polygons. What two
// patches share as boundary they share point by point, so that they neither overlap nor gape. Class -1
// is left out. sweeps is how often a cell takes the class of most of its neighbours.
func zones(ext geo.Extent, cellM float64, sweeps int, classify func(geo.XY) int) []zone {
	nx, ny := int((ext.MaxX-ext.MinX)/cellM)+2, int((ext.MaxY-ext.MinY)/cellM)+2
	cells := make([]int, nx*ny)
	for k := range cells {
		i, j := k%nx, k/nx
		cells[k] = -1
		if i > 0 && j > 0 && i < nx-1 && j < ny-1 {
			cells[k] = classify(geo.XY{X: ext.MinX + float64(cellM*(float64(i)-0.5)), Y: ext.MinY + float64(cellM*(float64(j)-0.5))})
		}
	}
	for range sweeps {
		cells = majority(cells, nx, ny)
	}
	joinCorners(cells, nx, ny)
	at := func(i, j int) int {
		if i < 0 || j < 0 || i >= nx || j >= ny {
			return -1
		}
		return cells[j*nx+i]
	}
	corner := func(i, j int) geo.XY {
		return geo.XY{X: ext.MinX + float64(cellM*float64(i-1)), Y: ext.MinY + float64(cellM*float64(j-1))}
	}
	// A corner where other than two boundaries meet is kept as a point of every ring through it.
	joint := func(i, j int) bool {
		a, b, c, d := at(i-1, j-1), at(i, j-1), at(i, j), at(i-1, j)
		n := 0
		for _, differ := range []bool{a != b, b != c, c != d, d != a} {
			if differ {
				n++
			}
		}
		return n != 2
	}
	dirs := [4][2]int{{1, 0}, {0, 1}, {-1, 0}, {0, -1}}
	// The cell on the left of the step from corner (i,j) in direction d.
	leftCell := func(i, j, d int) int {
		switch d {
		case 0:
			return at(i, j)
		case 1:
			return at(i-1, j)
		case 2:
			return at(i-1, j-1)
		}
		return at(i, j-1)
	}
	rightCell := func(i, j, d int) int {
		switch d {
		case 0:
			return at(i, j-1)
		case 1:
			return at(i, j)
		case 2:
			return at(i-1, j)
		}
		return at(i-1, j-1)
	}
	used := make([]bool, (nx+1)*(ny+1)*4)
	slot := func(i, j, d int) int { return (j*(nx+1)+i)*4 + d }
	var outers []zone
	type hole struct {
		class int
		ring  []geo.XY
	}
	var holes []hole
	for j := range ny + 1 {
		for i := range nx + 1 {
			for d := range 4 {
				c := leftCell(i, j, d)
				if c < 0 || c == rightCell(i, j, d) || used[slot(i, j, d)] {
					continue
				}
				var pts []geo.XY
				var keep []bool
				x, y, e := i, j, d
				for !used[slot(x, y, e)] {
					used[slot(x, y, e)] = true
					if joint(x, y) {
						pts, keep = append(pts, corner(x, y)), append(keep, true)
					}
					nxt := [2]int{x + dirs[e][0], y + dirs[e][1]}
					pts, keep = append(pts, along(corner(x, y), corner(nxt[0], nxt[1]), 0.5)), append(keep, false)
					x, y = nxt[0], nxt[1]
					for _, turn := range []int{1, 0, 3} {
						if f := (e + turn) % 4; leftCell(x, y, f) == c && rightCell(x, y, f) != c {
							e = f
							break
						}
					}
				}
				r := straighten(pts, keep)
				if len(r) < 3 {
					continue
				}
				if ringArea(r) > 0 {
					outers = append(outers, zone{class: c, outer: r})
				} else {
					holes = append(holes, hole{c, r})
				}
			}
		}
	}
	for _, h := range holes {
		best, at := math.Inf(1), -1
		for k, o := range outers {
			if a := ringArea(o.outer); o.class == h.class && a > -ringArea(h.ring) && a < best && inRing(along(h.ring[0], h.ring[1], 0.5), o.outer) {
				best, at = a, k
			}
		}
		if at >= 0 {
			outers[at].holes = append(outers[at].holes, h.ring)
		}
	}
	return outers
}

// joinCorners parts or joins cells where two of a class meet at a corner alone, so that no ring touches
// itself. Every change lowers a class, so it comes to an end.
func joinCorners(cells []int, nx, ny int) {
	for changed := true; changed; {
		changed = false
		for j := 0; j+1 < ny; j++ {
			for i := 0; i+1 < nx; i++ {
				sw, se, ne, nw := j*nx+i, j*nx+i+1, (j+1)*nx+i+1, (j+1)*nx+i
				for _, q := range [2][4]int{{sw, se, ne, nw}, {se, ne, nw, sw}} {
					a, b, c, d := cells[q[0]], cells[q[1]], cells[q[2]], cells[q[3]]
					if a != c || a < 0 || a == b || a == d {
						continue
					}
					switch {
					case b > a && b >= d:
						cells[q[1]] = a
					case d > a:
						cells[q[3]] = a
					default:
						cells[q[2]] = max(b, d)
					}
					changed = true
				}
			}
		}
	}
}

// straighten drops points in line with both neighbours. It looks at the points as given, never at what
// is left, so that both sides of a boundary drop the same ones.
func straighten(pts []geo.XY, keep []bool) []geo.XY {
	var out []geo.XY
	n := len(pts)
	for i := range n {
		a, b, c := pts[(i+n-1)%n], pts[i], pts[(i+1)%n]
		if keep[i] || math.Abs(cross(unit(a, b), unit(b, c))) > 1e-9 {
			out = append(out, b)
		}
	}
	return out
}

// majority gives each cell the class of most of the nine cells around it when that class has at least five.
func majority(cells []int, nx, ny int) []int {
	out := append([]int(nil), cells...)
	for j := 1; j < ny-1; j++ {
		for i := 1; i < nx-1; i++ {
			var seen [9]int
			n := 0
			for b := j - 1; b <= j+1; b++ {
				for a := i - 1; a <= i+1; a++ {
					seen[n] = cells[b*nx+a]
					n++
				}
			}
			for _, c := range seen {
				count := 0
				for _, d := range seen {
					if d == c {
						count++
					}
				}
				if count >= 5 {
					out[j*nx+i] = c
					break
				}
			}
		}
	}
	return out
}
