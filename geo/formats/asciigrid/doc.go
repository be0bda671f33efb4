// Package asciigrid reads grids of numbers in the plain-text form with a header of ncols, nrows,
// corner and cell size.
//
// The form has no standard; what is read here is what GDAL's AAIGrid driver writes: keys in any case
// and order, corner or centre of the lower left cell, square or oblong cells, values that wrap over
// lines, a decimal comma throughout. Left out: the reference system, which the form cannot hold, and
// compressed files.
package asciigrid
