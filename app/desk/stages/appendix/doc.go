// Package appendix is the last stage of the window: what leaves the program with its check code.
package appendix
