// Package svg writes scenes as scalable vector graphics.
package svg
