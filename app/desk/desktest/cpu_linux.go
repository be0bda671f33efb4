package desktest

import (
	"syscall"
	"time"
)

// threadTime gives the processor time that the calling thread has used. It does not grow while other
// programs have the processor, so that a busy machine fails no test.
func threadTime() time.Duration {
	const thread = 1 // RUSAGE_THREAD
	var u syscall.Rusage
	if err := syscall.Getrusage(thread, &u); err != nil {
		return 0
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}
