// Package desktest sets up a window on a computed study for tests, without a screen.
package desktest
