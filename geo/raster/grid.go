package raster

// Grid is one band of values on upright cells, with its place in the file's own coordinate system.
type Grid struct {
	NCols, NRows int
	XLL, YLL     float64 // outer corner of the lower left cell, in the units of the file's reference system
	CellX, CellY float64 // size of a cell, above 0
	NoData       float64 // the value of Values that means missing, exact as a float32
	Values       []float32
}

// At gives the value in the column counted from the west and the row counted from the north, both from
// 0; ok is false where it is missing or outside.
func (g *Grid) At(col, row int) (v float32, ok bool) {
	if col < 0 || row < 0 || col >= g.NCols || row >= g.NRows {
		return 0, false
	}
	v = g.Values[row*g.NCols+col]
	return v, v != float32(g.NoData)
}
