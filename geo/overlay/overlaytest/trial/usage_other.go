//go:build !unix

package main

// cpuSeconds and peakRSS are not known here.
func cpuSeconds() float64 { return 0 }

func peakRSS() int64 { return 0 }
