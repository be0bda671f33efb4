// Package overlay cuts, joins, widens polygons of the local frame to find what a site's rules leave, and
// what they leave of a district tile by tile.
//
// It is the only user of the GEOS library, through go-geos. That binding fails silently in several ways;
// each is closed off here, and each has a test in traps_test.go that fails without its guard:
//
//  1. A failed overlay gives a nil geometry with no error. Every result passes through Engine.own or
//     Engine.overlay; overlays are tried again on grids of 1 micrometre, 1 mm, 1 cm, then give an error.
//  2. A prepared geometry that is destroyed is destroyed again by its finalizer, which ends the program.
//     Engine.covers, the only place that prepares, clears the finalizer first.
//  3. Geometries of two contexts lock each other out for ever. A geometry of the library never leaves its
//     Engine: all methods take and give geo.XYGeometry, an Engine refuses a second goroutine, and one that
//     gives up its context forgets all that it kept.
//  4. A tree's query callback runs under the context's lock. The library's tree is not used: see geo/index.
//  5. A collection owns its members. Engine.collect is the only maker of collections and clears the slice
//     it was given.
//  6. Memory of the library is invisible to Go's collector. Every geometry made in a call is destroyed
//     when the call ends; what an Engine remembers of a site, and large polygons up to a bound, are destroyed
//     when others take their place and by Close.
//  7. Constructors panic on bad rings. Geometry goes in as well-known binary; a panic ends at the call's
//     border as an error, and the context is replaced.
//  8. The binding's next versions need a newer library than the systems we build on have. A test holds the
//     version that was tried.
//
// Two more that are not the binding's:
//
//   - A wrong overlay gives a polygon. Its area is held against the operands'; Buildable, moreover, measures
//     what is left apart from what is taken; the buffer that a width is kept by is checked and repaired.
//   - Positions that are not finite pass the reader and come out as nil or NaN. They are refused on the
//     way in, and on the way out.
//
// # Speed
//
// Buildable makes one polygon, of what is left, and only where something is left; what each rule takes alone
// and with others is counted by tally, which makes none. Widen layers once with NewLayer on all cores, take each
// site's rules from them with RuleOf, go through the sites in the order of index.Curve, and let a worker keep its
// Engine. go run ./cmd/dev overlay measures it on package overlaytest's set, beside a C program on the library
// that makes a polygon for every area.
package overlay
