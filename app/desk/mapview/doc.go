// Package mapview is the window's map of the district.
//
// It shows the pictures that a tiles.Painter makes in the background: the window's own goroutine only
// moves and stretches them. Names, letters, scale bar, legend are objects of the toolkit on top.
package mapview
