package chainfile

import (
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"time"
)

// Holder is who works in a folder.
type Holder struct {
	PID   int       `json:"pid"`
	Host  string    `json:"host"`
	Since time.Time `json:"since"`
}

// Busy is the error of a folder that somebody else works in.
type Busy struct {
	Dir    string
	Holder Holder // zero if it could not be read
}

// Error names the holder and what to do.
func (b *Busy) Error() string {
	if b.Holder.PID == 0 {
		return b.Dir + ": another process is writing to this folder; wait for it or stop it"
	}
	return fmt.Sprintf("%s: process %d on %s has been writing to this folder since %s; wait for it or stop it",
		b.Dir, b.Holder.PID, b.Holder.Host, b.Holder.Since.Format("2006-01-02 15:04:05"))
}

// Lock is the right to write to a folder, kept until it is released. The
// operating system takes it back when the process ends, however it ends.
type Lock struct{ f *os.File }

// Acquire locks dir, or returns a [*Busy] at once if somebody else has it.
func Acquire(dir string) (*Lock, error) {
	path := filepath.Join(dir, LockName)
	// Somebody who only looks (Running) may be in the way for an instant.
	for range 10 {
		l, err := tryAcquire(path)
		if l != nil || err != nil {
			return l, err
		}
		time.Sleep(10 * time.Millisecond)
	}
	return nil, &Busy{dir, readHolder(path)}
}

// tryAcquire returns nil, nil if the lock is taken.
func tryAcquire(path string) (*Lock, error) {
	f, err := os.OpenFile(path, os.O_RDWR|os.O_CREATE, 0o644)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: no such folder: %w", filepath.Dir(path), fs.ErrNotExist)
	}
	if err != nil {
		return nil, &Failure{Path: path, Err: err}
	}
	ok, err := take(f)
	if ok && err == nil {
		return &Lock{f}, nil
	}
	f.Close()
	if err != nil {
		err = &Failure{Path: path, Err: err}
	}
	return nil, err
}

// take locks f and writes who has it now. The holder before us removes the
// file when done: a lock on one that is no longer in place is worth nothing.
func take(f *os.File) (bool, error) {
	ok, err := tryLock(f, true)
	if !ok || err != nil || (&file{File: f}).present() != nil {
		return false, err
	}
	return true, writeHolder(f)
}

func writeHolder(f *os.File) error {
	host, _ := os.Hostname()
	b, err := json.Marshal(Holder{os.Getpid(), host, time.Now().Truncate(time.Second)})
	if err != nil {
		return err
	}
	if err := f.Truncate(0); err != nil {
		return err
	}
	_, err = f.WriteAt(append(b, '\n'), 0)
	return err
}

func readHolder(path string) (h Holder) {
	b, err := os.ReadFile(path)
	if err != nil || json.Unmarshal(b, &h) != nil {
		return Holder{}
	}
	return h
}

// Release removes the lock file and gives the folder free.
func (l *Lock) Release() error {
	os.Remove(l.f.Name()) // a leftover is harmless
	return l.f.Close()
}

// Running reports whether a living process holds the lock of dir, and who.
func Running(dir string) (Holder, bool, error) {
	path := filepath.Join(dir, LockName)
	f, err := os.Open(path)
	if errors.Is(err, fs.ErrNotExist) {
		return Holder{}, false, nil
	}
	if err != nil {
		return Holder{}, false, err
	}
	defer f.Close()
	free, err := tryLock(f, false)
	if err != nil || free {
		return Holder{}, false, err
	}
	return readHolder(path), true, nil
}
