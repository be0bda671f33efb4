//go:build unix

package main

import (
	"runtime"
	"syscall"
)

// cpuSeconds gives the processor time of this process so far, its own and the system's for it.
func cpuSeconds() float64 {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	sec := func(t syscall.Timeval) float64 { return float64(t.Sec) + 1e-6*float64(t.Usec) }
	return sec(u.Utime) + sec(u.Stime)
}

// peakRSS gives the most memory the process held so far, in bytes.
func peakRSS() int64 {
	var u syscall.Rusage
	if syscall.Getrusage(syscall.RUSAGE_SELF, &u) != nil {
		return 0
	}
	if runtime.GOOS == "darwin" || runtime.GOOS == "ios" {
		return int64(u.Maxrss)
	}
	return int64(u.Maxrss) << 10
}
