// Package crs relates positions in any coordinate reference system to a study's local metric frame.
//
// The frame (frame.go) is plain arithmetic; the library for foreign systems (library.go, transform.go)
// is linked here alone. A Frame is a value, free to share. A Library's Transforms may be used from any
// goroutine: the library's one context is locked for the length of a call.
package crs
