// Package terrain answers questions about a grid of heights.
package terrain
