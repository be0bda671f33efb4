// Package program wires up what the window and the terminal program stand on.
package program
