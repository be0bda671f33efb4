// Package desk is the window of the program.
package desk
