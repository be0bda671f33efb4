// Package xlsx reads one sheet of a workbook as a table.
//
// The workbook is one of Office Open XML, ECMA-376, as the ending .xlsx stands for. It is an archive of XML
// parts; they are read as streams, bounded by what really comes out and never by what a header promises.
// Values are those stored, not as they are shown: numbers whole, formulas by their last result, dates as
// ISO text. A part that is cut or damaged is an error, so that no table comes out shorter than it is. Left
// out: what is no value, such as notes, pictures, charts.
package xlsx
