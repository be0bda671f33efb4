// Package study is the open study: its settings, layers, groups, journal, undo and frozen states.
//
// It holds use cases and types only; it knows no SQL and no window.
package study
