// Package strip shows every consequence of the chosen candidates at the foot of the window.
package strip
