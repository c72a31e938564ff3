//go:build unix

package chainfile

import (
	"errors"
	"os"

	"golang.org/x/sys/unix"
)

// tryLock takes an advisory lock on f, exclusive or shared, without waiting.
// It ends with the last descriptor of f, hence with the process.
func tryLock(f *os.File, exclusive bool) (bool, error) {
	how := unix.LOCK_SH
	if exclusive {
		how = unix.LOCK_EX
	}
	err := unix.Flock(int(f.Fd()), how|unix.LOCK_NB)
	if errors.Is(err, unix.EWOULDBLOCK) {
		return false, nil
	}
	return err == nil, err
}

// syncDir makes a rename in dir survive a power cut.
func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}
