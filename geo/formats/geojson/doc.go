// Package geojson reads and writes GeoJSON.
//
// It follows RFC 7946, and for reading also RFC 8142 (text sequences), newline-delimited records and
// the crs member of the format's 2008 draft. The decoder reads a stream once and is strict: what
// cannot be read without a guess is an *Error that names the feature and the byte. Coordinates come
// back as they stand in the file, whatever their reference system.
//
// Left out: heights (dropped and counted), the bbox member and other foreign members (read over),
// reference systems given by a link.
package geojson
