package chainfile

import (
	"bufio"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"syscall"
	"time"
)

// DefaultInterval is how much work, at most, a power cut undoes.
const DefaultInterval = 3 * time.Second

// Options say how a chain is written. The zero value syncs after every step.
type Options struct {
	Interval time.Duration    // from one sync to the next
	Now      func() time.Time // time.Now unless set
}

// Writer appends steps to the chain of a run. It is not safe for concurrent
// use, and expects its caller to hold the lock of the folder.
type Writer struct {
	dir      string
	state    State
	interval time.Duration
	now      func() time.Time

	chain, sums *file
	sum         sum
	step        int // the last recorded step
	rows        []byte
	record      []byte

	last   time.Time // of the last sync
	err    error     // the first failure; everything after returns it
	closed bool
}

// file is one of the two growing files, buffered.
type file struct {
	*os.File
	out  *bufio.Writer
	size int64
}

func newFile(f *os.File, err error) (*file, error) {
	if err != nil {
		return nil, err
	}
	return &file{File: f, out: bufio.NewWriterSize(f, 1<<18)}, nil
}

func (f *file) append(b []byte) error {
	f.size += int64(len(b))
	_, err := f.out.Write(b)
	return err
}

func (f *file) sync() error {
	if err := f.out.Flush(); err != nil {
		return err
	}
	return f.Sync()
}

// cut shortens the file to size and goes on there.
func (f *file) cut(size int64) error {
	if err := f.Truncate(size); err != nil {
		return err
	}
	f.size = size
	_, err := f.Seek(size, io.SeekStart)
	return err
}

// present fails when the path no longer leads to the open file.
func (f *file) present() error {
	open, err := f.Stat()
	if err != nil {
		return err
	}
	named, err := os.Stat(f.Name())
	if err != nil {
		return err
	}
	if !os.SameFile(open, named) {
		return errReplaced
	}
	return nil
}

var errReplaced = errors.New("another file has taken its place")

// Create starts the chain of run in dir, which must exist and hold no chain.
func Create(dir string, run Run, o Options) (*Writer, error) {
	if err := run.check(); err != nil {
		return nil, err
	}
	w := newWriter(dir, State{Schema: Schema, Run: run}, o)
	w.state.Started = w.last.UTC().Truncate(time.Second)
	return w.open(os.O_RDWR|os.O_CREATE|os.O_EXCL, w.begin)
}

// Resume goes on where rec, the outcome of [Recover] on the same folder and
// state, says that the valid chain ends. What follows there is cut off; if it
// holds steps that had been safe, it is first copied to [CutName].
func Resume(dir string, s State, rec Recovered, o Options) (*Writer, error) {
	w := newWriter(dir, s, o)
	w.state.Finished = false
	return w.open(os.O_RDWR, func() error {
		if rec.Lost > 0 {
			if err := w.setAside(rec.Bytes); err != nil {
				return err
			}
		}
		if rec.Steps == 0 {
			return w.begin()
		}
		w.sum, w.step = rec.sum, rec.Step
		w.state.Step, w.state.Bytes = rec.Step, rec.Bytes
		if err := w.chain.cut(rec.Bytes); err != nil {
			return err
		}
		return w.sums.cut(int64(1+rec.Steps) * recordLen)
	})
}

func newWriter(dir string, s State, o Options) *Writer {
	w := &Writer{dir: dir, state: s, interval: o.Interval, now: o.Now}
	if w.now == nil {
		w.now = time.Now
	}
	w.last = w.now()
	return w
}

// open opens both files, prepares them and syncs once.
func (w *Writer) open(flag int, prepare func() error) (*Writer, error) {
	var err error
	if w.chain, err = newFile(os.OpenFile(w.path(ChainName), flag, 0o644)); err != nil {
		return nil, w.failure(ChainName, err)
	}
	if w.sums, err = newFile(os.OpenFile(w.path(SumsName), flag, 0o644)); err != nil {
		w.chain.Close()
		return nil, w.failure(SumsName, err)
	}
	if err = prepare(); err != nil {
		err = w.failure(ChainName, err)
	} else {
		err = w.Sync()
	}
	if err != nil {
		w.chain.Close()
		w.sums.Close()
		return nil, err
	}
	return w, nil
}

// begin writes the header and the record that vouches for it.
func (w *Writer) begin() error {
	w.sum, w.step = w.state.seal(), 0
	for _, f := range []*file{w.chain, w.sums} {
		if err := f.cut(0); err != nil {
			return err
		}
	}
	if err := w.chain.append(w.state.header()); err != nil {
		return err
	}
	return w.sums.append(record{sum: w.sum}.append(nil))
}

// setAside copies chain.csv from a byte on.
func (w *Writer) setAside(from int64) (err error) {
	if _, err = w.chain.Seek(from, io.SeekStart); err != nil {
		return err
	}
	f, err := os.Create(w.path(CutName))
	if err != nil {
		return err
	}
	_, err = io.Copy(f, w.chain)
	if err = errors.Join(err, f.Sync(), f.Close()); err != nil {
		os.Remove(f.Name())
	}
	return err
}

// Append records a step, and syncs when it is time to. The step must have
// the shape of the run and be the next one to record; anything else panics.
// A number that is not finite is refused.
func (w *Writer) Append(s Step) error {
	if w.err != nil {
		return w.err
	}
	if err := w.checkStep(s); err != nil {
		return err
	}
	w.rows = w.state.appendStep(w.rows[:0], s)
	w.sum, w.step = w.sum.next(w.rows, s.Accepted), s.Number
	w.record = record{w.sum, s.Accepted}.append(w.record[:0])
	if err := w.chain.append(w.rows); err != nil {
		return w.fail(ChainName, err)
	}
	if err := w.sums.append(w.record); err != nil {
		return w.fail(SumsName, err)
	}
	return w.Tick()
}

func (w *Writer) checkStep(s Step) error {
	r := w.state.Run
	if s.Number != w.step+r.Every || len(s.X) != r.Ensembles || len(s.LogP) != r.Ensembles {
		panic(fmt.Sprintf("chainfile: step %d of %d, %d ensembles after step %d", s.Number, len(s.X), len(s.LogP), w.step))
	}
	for e := range r.Ensembles {
		if len(s.LogP[e]) != r.Walkers || len(s.X[e]) != r.Walkers*len(r.Parameters) {
			panic(fmt.Sprintf("chainfile: ensemble %d has %d and %d numbers", e, len(s.X[e]), len(s.LogP[e])))
		}
		if !allFinite(s.X[e]) || !allFinite(s.LogP[e]) {
			return fmt.Errorf("step %d: ensemble %d holds a number that is not finite", s.Number, e)
		}
	}
	return nil
}

func allFinite(x []float64) bool {
	for _, v := range x {
		if !finite(v) {
			return false
		}
	}
	return true
}

// Tick syncs when it is time to. Call it after steps that are not recorded.
// Neither a clock set back nor one set forward can put a sync off.
func (w *Writer) Tick() error {
	if w.err != nil {
		return w.err
	}
	if d := w.now().Sub(w.last); d < w.interval && d >= 0 {
		return nil
	}
	return w.Sync()
}

// Sync makes everything appended safe from a crash and renews run.json.
func (w *Writer) Sync() error {
	if w.err != nil {
		return w.err
	}
	now := w.now()
	w.state.Seconds += max(0, now.Sub(w.last).Seconds())
	w.last = now
	for _, f := range []*file{w.chain, w.sums} {
		if err := f.sync(); err != nil {
			return w.fail(filepath.Base(f.Name()), err)
		}
		if err := f.present(); err != nil {
			return w.fail(filepath.Base(f.Name()), err)
		}
	}
	next := w.state
	next.Step, next.Bytes = w.step, w.chain.size
	if err := writeState(w.dir, next); err != nil {
		return w.fail(StateName, err)
	}
	w.state = next
	return nil
}

// SetProgress keeps v, as JSON, in the state from the next sync on. It fails
// only if v cannot be encoded.
func (w *Writer) SetProgress(v any) error {
	b, err := json.Marshal(v)
	if err == nil {
		w.state.Progress = b
	}
	return err
}

// State is the state as of the last sync.
func (w *Writer) State() State { return w.state }

// Close syncs and closes the files. finished says that the goal was met;
// otherwise the run is left as unfinished. It returns the first error of the
// writer's life, and nothing when called again.
func (w *Writer) Close(finished bool) error {
	if w.closed {
		return nil
	}
	w.closed = true
	w.state.Finished = finished
	return errors.Join(w.Sync(), w.chain.Close(), w.sums.Close())
}

func (w *Writer) path(name string) string { return filepath.Join(w.dir, name) }

func (w *Writer) fail(name string, err error) error {
	w.err = w.failure(name, err)
	return w.err
}

func (w *Writer) failure(name string, err error) error {
	return &Failure{Path: w.path(name), Step: w.state.Step, Err: err}
}

// Failure is a chain that cannot be written. What was synced before is safe.
type Failure struct {
	Path string
	Step int // the last step that is safe, 0 if none
	Err  error
}

// Error says what happened, what is safe and what to do, in one line.
func (f *Failure) Error() string {
	cause := f.Err
	var path *fs.PathError
	if errors.As(cause, &path) {
		cause = path.Err
	}
	safe := ""
	if f.Step > 0 {
		safe = fmt.Sprintf(" the chain is safe up to step %d;", f.Step)
	}
	return fmt.Sprintf("%s: %v;%s %s", f.Path, cause, safe, f.remedy())
}

func (f *Failure) remedy() string {
	switch {
	case errors.Is(f.Err, syscall.ENOSPC), errors.Is(f.Err, syscall.EDQUOT):
		return "free some space, then resume"
	case errors.Is(f.Err, fs.ErrPermission), errors.Is(f.Err, syscall.EROFS):
		return "make the folder writable or choose another"
	case errors.Is(f.Err, fs.ErrExist):
		return "resume the run in this folder or choose another"
	case errors.Is(f.Err, fs.ErrNotExist), errors.Is(f.Err, errReplaced):
		return "the folder was removed or renamed: put it back, then resume"
	}
	return "mend the cause, then resume"
}

// Unwrap gives the cause to errors.Is.
func (f *Failure) Unwrap() error { return f.Err }
