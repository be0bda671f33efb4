// Package draw describes maps as scenes of simple shapes that any back end can paint.
package draw
