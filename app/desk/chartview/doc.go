// Package chartview shows charts in the window.
package chartview
