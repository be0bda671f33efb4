// Package gpkgout writes layers into a new GeoPackage for other programs to read.
//
// The file follows OGC 12-128r18 (application_id GPKG, user_version 10300) in EPSG:4326. Every layer
// becomes a table: of features with a spatial index where it has geometries, else of attributes. The
// same layers under the same options give the same bytes. A new file replaces an old one whole or not
// at all.
//
// The spatial index is registered and filled (clause F.3, gpkg_rtree_index). Its triggers, which keep
// it right while the table is edited, call functions beginning with ST_ that SQLite alone does not
// have. They are left out unless Options.Triggers asks for them. Without them every program can edit
// the table, but an edit leaves the index behind: a geometry that was added or moved is then not found
// by a program that searches with the index. With them a geographic information system edits the table
// and keeps the index right, while a program without those functions is refused.
//
// Left out: styles, metadata, constraints on values.
package gpkgout
