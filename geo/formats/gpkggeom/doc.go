// Package gpkggeom reads and writes the geometry blob of a GeoPackage.
//
// The blob is the header of OGC 12-128r18, clause 2.1.3, followed by a well-known binary geometry
// (OGC 06-103r4, clause 8). Coordinates keep their bits both ways. Left out: curved geometries and
// solids (refused with ErrCurved), the extended blob type (ErrExtended), heights and measures, which
// are read over and reported in Blob.Dropped.
package gpkggeom
