// Package explore takes a job from its posterior to a chain: it finds the best
// fit, starts the ensembles around it, runs them until the goal is met, and keeps
// the chain in the run's folder so that nothing computed is lost.
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
	"omen/cmd/omen/internal/progress"
	"omen/cmd/omen/internal/result"
	"omen/sampler"
)

// RunFileName is the resolved run file in the folder of a run.
const RunFileName = "run.toml"

// Options say how a run is carried out. None of them changes a number in the
// chain.
type Options struct {
	Threads int // 0: one per processor
	Quiet   bool
	Version string
}

// session is a run under way.
type session struct {
	job     *job.Job
	dir     string
	options Options
	chain   *sampler.Chain
	writer  *chainfile.Writer
	step    chainfile.Step
	meter   *progress.Meter
	best    []float64
	dense   []sampler.Density
	begun   time.Time
	before  float64 // seconds of earlier sessions
}

// Start begins a run in dir, which must be new or empty, and takes it as far as
// its goal, its limits or ctx allow. The lock of the folder is held throughout.
func Start(ctx context.Context, j *job.Job, dir string, o Options, stderr io.Writer) (*result.Run, error) {
	if err := prepare(dir); err != nil {
		return nil, err
	}
	lock, err := chainfile.Acquire(dir)
	if err != nil {
		return nil, err
	}
	defer lock.Release()
	s, err := newSession(j, dir, o, stderr)
	if err != nil {
		return nil, err
	}
	text, err := j.Run.Resolved(dir)
	if err != nil {
		return nil, err
	}
	if err := os.WriteFile(filepath.Join(dir, RunFileName), text, 0o644); err != nil {
		return nil, err
	}
	if s.writer, err = chainfile.Create(dir, s.identity(), chainfile.Options{Interval: chainfile.DefaultInterval}); err != nil {
		return nil, err
	}
	return s.run(ctx)
}

// ErrExists is the error of a folder that holds something already.
var ErrExists = errors.New("the folder exists and is not empty")

// prepare makes the folder.
func prepare(dir string) error {
	if err := os.MkdirAll(filepath.Dir(dir), 0o755); err != nil {
		return err
	}
	err := os.Mkdir(dir, 0o755)
	if !errors.Is(err, os.ErrExist) {
		return err
	}
	names, err := os.ReadDir(dir)
	if err == nil && len(names) > 0 {
		return fmt.Errorf("%s: %w; go on with its run by omen resume %s, or choose another with -o", dir, ErrExists, dir)
	}
	return err
}

// newSession finds the best fit and places the walkers.
func newSession(j *job.Job, dir string, o Options, stderr io.Writer) (*session, error) {
	s := &session{job: j, dir: dir, options: o, begun: time.Now()}
	sampling := j.Run.Sampling
	for range sampling.Ensembles {
		s.dense = append(s.dense, j.Posterior.Evaluator().LogDensity)
	}
	lo, hi := j.Space.Box()
	var err error
	if s.best, _, err = sampler.Maximise(s.dense[0], lo, hi, sampling.Seed); err != nil {
		return nil, j.Run.Errorf("prior", "no universe within the priors agrees with being observed at all (%v); widen the priors", err)
	}
	dim := j.Space.Dim()
	starts := make([][]float64, sampling.Ensembles)
	for m := range starts {
		if starts[m], err = sampler.Scatter(s.dense[m], s.best, lo, hi, s.walkers(), sampling.Seed, m); err != nil {
			return nil, err
		}
	}
	if s.chain, err = sampler.NewChain(dim, starts, sampling.RecordEvery, sampler.DefaultRecord); err != nil {
		return nil, err
	}
	s.meter = progress.New(stderr, o.Quiet)
	return s, nil
}

func (s *session) walkers() int {
	if n := s.job.Run.Sampling.Walkers; n > 0 {
		return n
	}
	return sampler.DefaultWalkers(s.job.Space.Dim())
}
