// Package csvtable reads tables of delimited text.
//
// It follows RFC 4180 with the freedoms seen in practice: comma, semicolon, tabulator or bar between
// cells, a decimal comma, a byte order mark, line breaks inside quotes, a first line "sep=;". What can
// be meant in two ways is an *Error with the row, never a guess: thousand separators above all. Left
// out: dates (kept as text), comment lines, quotes in the middle of an unquoted cell (an error).
package csvtable
