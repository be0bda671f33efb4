//go:build !linux

package desktest

import "time"

var began = time.Now()

// threadTime gives the time since the start, for systems that do not tell a thread's own.
func threadTime() time.Duration { return time.Since(began) }
