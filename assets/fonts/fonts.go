// Package fonts embeds the typeface that ships with the program.
//
// It is Lato 2.007 in two weights: figures of equal width, and the glyphs that units and formulas need
// (₂ ² · ≥ ≤ − α η →). Its licence is OFL.txt beside it.
package fonts

import _ "embed"

//go:embed Lato-Regular.ttf
var regular []byte

//go:embed Lato-Bold.ttf
var bold []byte

// Regular gives the TrueType file of the regular weight; it must not be changed.
func Regular() []byte { return regular }

// Bold gives the TrueType file of the bold weight; it must not be changed.
func Bold() []byte { return bold }
