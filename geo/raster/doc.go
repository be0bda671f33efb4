// Package raster holds grids of numbers as map files have them.
package raster
