// Package worldfile places pictures on the map by the six numbers that stand in a file beside them.
//
// Pictures are PNG and JPEG as the standard library reads them, and TIFF of 8 bits for each channel: red,
// green and blue with or without opacity, a palette, or grey. A TIFF may say its place itself.
package worldfile
