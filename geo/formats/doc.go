// Package formats says what a reader of files found wrong with one.
package formats
