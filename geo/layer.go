package geo

import "strconv"

// ValueKind says what a field holds.
type ValueKind uint8

// The kinds of field value. Null is a missing value and is never read as zero or as an empty text.
const (
	Null ValueKind = iota
	Text
	Number
	Bool
)

// Value is one attribute of a feature.
type Value struct {
	Kind   ValueKind
	Text   string
	Number float64
	Bool   bool
}

// TextValue, NumberValue and BoolValue make values.
func TextValue(s string) Value    { return Value{Kind: Text, Text: s} }
func NumberValue(f float64) Value { return Value{Kind: Number, Number: f} }
func BoolValue(b bool) Value      { return Value{Kind: Bool, Bool: b} }

// String gives the value as text; a Null gives "".
func (v Value) String() string {
	switch v.Kind {
	case Text:
		return v.Text
	case Number:
		return strconv.FormatFloat(v.Number, 'g', -1, 64)
	case Bool:
		return strconv.FormatBool(v.Bool)
	}
	return ""
}

// Float gives the value as a number; a text that reads as a number counts.
func (v Value) Float() (float64, bool) {
	switch v.Kind {
	case Number:
		return v.Number, true
	case Text:
		f, err := strconv.ParseFloat(v.Text, 64)
		return f, err == nil && finite(f)
	}
	return 0, false
}

// Column describes one attribute of a layer.
type Column struct {
	Name     string
	Unit     string // empty when it has none or it is not known
	Personal bool   // never reaches a drawing, a public form or an export that does not ask for it
}

// Feature is one thing on the map with its attributes in the order of the layer's columns.
type Feature struct {
	ID       string // unique in its layer
	Geometry LonLatGeometry
	Values   []Value
}

// Layer is a set of features with common columns, in longitude and latitude on WGS 84.
type Layer struct {
	Name     string
	Columns  []Column
	Features []Feature
}

// ColumnIndex gives the position of the named column, or -1.
func (l *Layer) ColumnIndex(name string) int {
	for i, c := range l.Columns {
		if c.Name == name {
			return i
		}
	}
	return -1
}

// Severity ranks notices.
type Severity uint8

// The severities: Info needs no action, Warning may change results, Fault makes results unreliable.
const (
	Info Severity = iota
	Warning
	Fault
)

func (s Severity) String() string { return [...]string{"info", "warning", "fault"}[s] }

// Notice says what was found, where, and what was done about it. Its text for people is made in
// app/present from the code and the arguments.
type Notice struct {
	Code     string            `json:"code"`
	Severity Severity          `json:"severity"`
	File     string            `json:"file,omitempty"`
	Layer    string            `json:"layer,omitempty"`
	Feature  string            `json:"feature,omitempty"` // feature identifier or 1-based number
	Field    string            `json:"field,omitempty"`
	Line     int               `json:"line,omitempty"`
	At       *LonLat           `json:"at,omitempty"`
	Args     map[string]string `json:"args,omitempty"`
	Cause    string            `json:"cause,omitempty"` // code of the notice that brought this one about
}
