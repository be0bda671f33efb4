// Package tiles draws a district's map in square tiles behind the window's back.
//
// A tile is drawn once, into a number per pixel that names the parcel and an overlay of everything that
// lies on top. Colouring it is then a look-up per pixel, so that moving a weight re-colours the map
// without touching geometry again. What is drawn is the same for the same ground, view and shading,
// on one core or many. No toolkit is imported here.
package tiles
