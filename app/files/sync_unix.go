//go:build unix

package files

import (
	"errors"
	"os"
	"syscall"
)

// syncFolder makes the new name survive a power cut. Some network file systems cannot do it for a
// folder, which is no fault of the file.
func (real) syncFolder(path string) error {
	d, err := os.Open(path)
	if err != nil {
		return err
	}
	err = d.Sync()
	if errors.Is(err, syscall.EINVAL) || errors.Is(err, syscall.ENOTSUP) {
		err = nil
	}
	return errors.Join(err, d.Close())
}
