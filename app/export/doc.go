// Package export writes layers as files for other programs.
//
// GeoJSON and CSV hold one layer, a GeoPackage any number. A file is written whole or not at all, and
// one that is there is replaced only where that is asked for. Positions are degrees of longitude and
// latitude on WGS 84 throughout.
//
// CSV follows RFC 4180 in UTF-8. A spreadsheet takes a cell that begins with =, +, -, @, a tabulator or
// a carriage return for a formula; where such a cell is text it gets an apostrophe in front, which
// whoever reads the table by other means must take away.
package export
