//go:build unix

package main

import (
	"os/exec"
	"syscall"
)

// ownGroup starts cmd in a process group of its own, so that stopping it also stops what it
// started: the go command does not hand a signal on to running tests. The signal asks rather
// than kills, so that a package manager can leave its database in order.
func ownGroup(cmd *exec.Cmd) {
	cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true}
	cmd.Cancel = func() error { return syscall.Kill(-cmd.Process.Pid, syscall.SIGTERM) }
}
