// Package hgt reads tiles of heights whose place stands in the name of the file.
//
// A tile covers one degree by one degree with 1,201 by 1,201 or 3,601 by 3,601 samples, rows from north
// to south, each a height in metres as a signed number of 16 bits, most significant byte first. The
// first and last samples lie on the edges of the tile, so cells are centred on the samples and the grid
// is half a cell larger on each side. Left out: packed tiles and tiles of other sizes.
package hgt
