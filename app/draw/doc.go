// Package draw describes maps, charts as scenes of simple shapes that any back end can paint.
package draw
