// Package live keeps an open study computed while it is being edited.
//
// Edits run one after the other on a goroutine of their own, computing on another; the newest state
// wins. What they found is published as an immutable View.
package live
