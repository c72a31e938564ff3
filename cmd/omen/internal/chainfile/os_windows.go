package chainfile

import (
	"errors"
	"os"

	"golang.org/x/sys/windows"
)

// tryLock locks one byte far past the end of f, so that who holds the lock
// stays readable. It ends with the handle, hence with the process.
func tryLock(f *os.File, exclusive bool) (bool, error) {
	flags := uint32(windows.LOCKFILE_FAIL_IMMEDIATELY)
	if exclusive {
		flags |= windows.LOCKFILE_EXCLUSIVE_LOCK
	}
	at := &windows.Overlapped{OffsetHigh: 1}
	err := windows.LockFileEx(windows.Handle(f.Fd()), flags, 0, 1, 0, at)
	if errors.Is(err, windows.ERROR_LOCK_VIOLATION) || errors.Is(err, windows.ERROR_IO_PENDING) {
		return false, nil
	}
	return err == nil, err
}

// syncDir does nothing: Windows cannot flush a folder.
func syncDir(string) error { return nil }
