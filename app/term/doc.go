// Package term is the terminal program: one file a verb, over the same code as the window.
package term
