// Package index finds the boxes that meet a box.
package index
