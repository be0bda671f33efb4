// Package ground is the first stage of the window: everything that is known about the place.
package ground
