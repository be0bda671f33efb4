// Package overlay cuts, joins, widens polygons of the local frame to find what a site's rules leave.
//
// It is the only user of the GEOS library, through go-geos. That binding fails silently in several ways;
// each is closed off here:
//
//   - A failed overlay gives a nil geometry with no error. Every result passes through Engine.own or
//     Engine.overlay; overlays are tried again on grids of 1 micrometre, 1 mm, 1 cm, then give an error.
//   - A wrong overlay gives a polygon. Its area is held against the operands'; Buildable, moreover, measures
//     what is left apart from what is taken.
//   - A prepared geometry that is destroyed is destroyed again by its finalizer, which ends the program.
//     Engine.covers, the only place that prepares, clears the finalizer first.
//   - Geometries of two contexts lock each other out for ever. A geometry of the library never leaves its
//     Engine: all methods take and give geo.XYGeometry, and an Engine refuses a second goroutine.
//   - A tree's query callback runs under the context's lock. The library's tree is not used: see geo/index.
//   - A collection owns its members. Engine.collect is the only maker of collections and clears the slice
//     it was given.
//   - Memory of the library is invisible to Go's collector. Every geometry made in a call is destroyed
//     when the call ends; what Buildable remembers of a site is kept as bytes.
//   - Constructors panic on bad rings. Geometry goes in as well-known binary; a panic ends at the call's
//     border as an error, and the context is replaced.
//   - Positions that are not finite pass the reader and come out as nil or NaN. They are refused on the
//     way in, and on the way out.
package overlay
