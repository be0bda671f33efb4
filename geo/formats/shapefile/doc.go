// Package shapefile reads sets of files in the published shapefile layout of 1998.
//
// A set is a .shp with the shapes, a .dbf with a row of attributes for each, a .shx with the place of each
// shape, a .prj with the coordinate system, a .cpg with the name of the text's encoding. Only the .shp must
// be there. Coordinates come out as they stand in the file, east before north; who calls projects them with
// the text of the .prj. Which rings are holes is told by which lies in which, never by their direction,
// because many writers have it wrong. Left out: heights, measures, memo columns, multipatches (refused).
package shapefile
