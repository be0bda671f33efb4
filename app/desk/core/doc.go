// Package core is what the panes of the window share: the session, what is chosen, who is told of changes.
package core
