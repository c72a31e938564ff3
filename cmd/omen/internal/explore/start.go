package explore

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"time"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/result"
)

// Start begins a run in dir, which must be new or empty, and takes it as far as
// its goal, its limits or ctx allow. Nothing is written before the best fit is
// found. The lock of the folder is held throughout.
func Start(ctx context.Context, j *job.Job, dir string, o Options, stderr io.Writer) (*result.Run, error) {
	if err := vacate(dir, false); err != nil {
		return nil, err
	}
	s, err := newSession(j, dir, o, stderr)
	if err != nil {
		return nil, err
	}
	if ctx.Err() != nil {
		return nil, ErrTooEarly
	}
	lock, err := occupy(dir)
	if err != nil {
		return nil, err
	}
	err = s.create()
	defer func() {
		lock.Release()
		if s.writer == nil {
			os.Remove(dir) // unless it holds something
		}
	}()
	if err != nil {
		vacate(dir, true)
		return nil, err
	}
	return s.run(ctx)
}

// vacate reports a folder that a new run cannot have, and clears away what a run
// that never came to its first step left there.
func vacate(dir string, clear bool) error {
	names, ok, err := chainfile.Leftovers(dir, RunFileName)
	if err != nil {
		return err
	}
	if !ok {
		return occupied(dir)
	}
	for _, name := range names {
		if clear {
			err = errors.Join(err, os.Remove(name))
		}
	}
	return err
}

// occupied says what a folder that is in use is in use for.
func occupied(dir string) error {
	if holder, running, err := chainfile.Running(dir); running && err == nil {
		return &chainfile.Busy{Dir: dir, Holder: holder}
	}
	if _, err := chainfile.ReadState(dir); err == nil {
		return &Refused{dir, "the folder holds a run already; go on with it by omen resume " + dir + ", or choose another folder with -o"}
	}
	return &Refused{dir, "the folder exists and is not empty; choose another with -o"}
}

// occupy makes the folder and locks it.
func occupy(dir string) (*chainfile.Lock, error) {
	if err := os.MkdirAll(dir, 0o755); err != nil {
		var path *os.PathError
		errors.As(err, &path)
		return nil, fmt.Errorf("%s: cannot make the folder: %w; choose another with -o", dir, path.Err)
	}
	lock, err := chainfile.Acquire(dir)
	if err != nil {
		var busy *chainfile.Busy
		if !errors.As(err, &busy) { // no room for the lock, say
			os.Remove(filepath.Join(dir, chainfile.LockName))
			os.Remove(dir)
		}
		return nil, err
	}
	if err := vacate(dir, true); err != nil {
		lock.Release()
		return nil, err
	}
	return lock, nil
}

// create writes the resolved run file and begins the chain.
func (s *session) create() error {
	text, err := s.job.Run.Resolved(s.dir)
	if err != nil {
		return err
	}
	if err := keep(s.dir, text); err != nil {
		return err
	}
	run, err := identity(s.job, text)
	if err != nil {
		return err
	}
	if err := settle(s.job, s.dir, text); err != nil {
		return err
	}
	s.writer, err = chainfile.Create(s.dir, run, s.writing())
	return err
}

// keep writes the resolved run file.
func keep(dir string, text []byte) error {
	path := filepath.Join(dir, RunFileName)
	if err := chainfile.Replace(path, text); err != nil {
		return &chainfile.Failure{Path: path, Err: err}
	}
	return nil
}

func (s *session) writing() chainfile.Options {
	return chainfile.Options{Interval: time.Duration(s.job.Run.Sampling.SyncInterval)}
}
