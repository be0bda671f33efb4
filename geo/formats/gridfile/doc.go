// Package gridfile is the one door to grids of numbers that are kept as bytes.
package gridfile
