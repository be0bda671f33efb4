// Package widgets holds the small pieces that the panes of the window are made of.
package widgets
