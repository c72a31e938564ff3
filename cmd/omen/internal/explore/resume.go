package explore

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strings"
	"time"

	"omen/cmd/omen/internal/cache"
	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/progress"
	"omen/cmd/omen/internal/result"
	"omen/cmd/omen/internal/runfile"
)

// Resume takes the run in dir on from its last complete step. Settings (key=value,
// as --set takes them) give it new goals, which its run file then keeps; anything
// else that differs from the run that was started is [Refused]. What is amiss with
// the chain is told on stderr.
func Resume(ctx context.Context, dir string, sets []string, o Options, stderr io.Writer) (*result.Run, error) {
	state, err := readState(dir)
	if err != nil {
		return nil, err
	}
	lock, err := chainfile.Acquire(dir)
	if err != nil {
		return nil, err
	}
	defer lock.Release()
	if state, err = readState(dir); err != nil { // now that nobody writes
		return nil, err
	}
	j, text, err := reload(dir, sets, o.Cache)
	if err != nil {
		return nil, err
	}
	if err := same(dir, state.Run, j, text); err != nil {
		return nil, err
	}
	s, err := newSession(j, dir, o, stderr)
	if err != nil {
		return nil, err
	}
	if err := s.restore(state, stderr); err != nil {
		return nil, err
	}
	if len(sets) > 0 {
		if err := keep(dir, text); err != nil {
			return nil, err
		}
	}
	return s.run(ctx)
}

// readState reads run.json and checks the version of the chain first: whatever
// else a newer program wrote may not be understood.
func readState(dir string) (chainfile.State, error) {
	state, err := chainfile.ReadState(dir)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return state, &Refused{dir, NoRun}
	case err == nil && state.Format != chainfile.Format:
		return state, refuse(dir, []chainfile.Change{{What: "chain-format version",
			Was: fmt.Sprint(state.Format), Is: fmt.Sprint(chainfile.Format)}})
	}
	return state, err
}

// NoRun is what to say of a folder without a run.
const NoRun = "no run in this folder (no " + chainfile.StateName + "); name the folder that omen fit made, or begin with omen fit RUN.toml"

// reload reads the run file in dir and everything it names, as they are now.
func reload(dir string, sets []string, c *cache.Cache) (*job.Job, []byte, error) {
	file := filepath.Join(dir, RunFileName)
	text, err := os.ReadFile(file)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil, &Refused{dir, "the run file " + RunFileName + " is gone; put it back"}
	}
	if err != nil {
		return nil, nil, err
	}
	run, err := runfile.Parse(file, text, sets)
	if err != nil {
		return nil, nil, err
	}
	j, err := job.LoadToFit(run, c)
	if err != nil {
		return nil, nil, err
	}
	if len(sets) > 0 {
		if text, err = run.Resolved(dir); err != nil {
			return nil, nil, err
		}
	}
	return j, text, nil
}

// same refuses a run that is not the one that was started.
func same(dir string, was chainfile.Run, j *job.Job, text []byte) error {
	is, err := identity(j, text)
	if err != nil {
		return err
	}
	if changes := chainfile.Compare(was, is); len(changes) > 0 {
		return refuse(dir, changes)
	}
	return settle(j, dir, text)
}

func refuse(dir string, changes []chainfile.Change) error {
	var list []string
	for _, c := range changes {
		list = append(list, c.String())
	}
	return &Refused{dir, "cannot go on, for this is no longer the run that was started: " + strings.Join(list, "; ") +
		"; put back what it was, or begin anew with omen fit"}
}

// restore fills the chain from the folder and opens the folder for more.
func (s *session) restore(state chainfile.State, stderr io.Writer) error {
	rec, err := chainfile.Recover(s.dir, state, func(step chainfile.Step) error {
		if err := s.verify(step); err != nil {
			return err
		}
		s.meter.Show(progress.Update{Steps: step.Number, Note: "reading " + chainfile.ChainName})
		return s.chain.Append(step.Number, step.X, step.LogP, step.Accepted)
	})
	if err != nil {
		return incomplete(s.dir, err)
	}
	if notice := rec.Notice(); notice != "" {
		s.tell(stderr, notice)
	}
	s.before = time.Duration(state.Seconds * float64(time.Second))
	s.writer, err = chainfile.Resume(s.dir, state, rec, s.writing())
	return err
}

// tell says what must be said, quiet or not.
func (s *session) tell(stderr io.Writer, text string) {
	if s.options.Quiet {
		fmt.Fprintln(stderr, text)
		return
	}
	s.meter.Message(text)
}

// tolerance is what rounding may change in a log-posterior between builds of the
// same source for different processors.
func tolerance(logp float64) float64 { return 1e-6 + 1e-9*math.Abs(logp) }

// verify evaluates one walker of every ensemble again at recorded steps 1, 2, 4,
// 8, …: what the files cannot show is a program that computes something else.
func (s *session) verify(step chainfile.Step) error {
	n := step.Number / s.job.Run.Sampling.RecordEvery
	if n&(n-1) != 0 {
		return nil
	}
	dim := s.job.Space.Dim()
	for e, logp := range step.LogP {
		w := n % len(logp)
		if is := s.dense[e](step.X[e][w*dim : (w+1)*dim]); !(math.Abs(is-logp[w]) <= tolerance(logp[w])) {
			return &Refused{s.dir, fmt.Sprintf("cannot go on, for this program computes another posterior: log_posterior of walker %d of ensemble %d at step %d was %v, is now %v; use the version that began the run, or begin anew with omen fit",
				w, e, step.Number, logp[w], is)}
		}
	}
	return nil
}

// incomplete says what to do about a run that lacks one of its files; any other
// error stays what it is.
func incomplete(dir string, err error) error {
	var path *fs.PathError
	if !errors.Is(err, fs.ErrNotExist) || !errors.As(err, &path) {
		return err
	}
	return &Refused{dir, filepath.Base(path.Path) + " is missing; put it back from a copy, or begin again in another folder"}
}
