// Package explore takes a job from its posterior to a chain: it finds the best
// fit, starts the ensembles around it, runs them until the goal is met, and keeps
// the chain in the run's folder so that nothing computed is lost.
package explore

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
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
	best    []float64
	dense   []sampler.Density // one for each ensemble

	meter    *progress.Meter
	forecast progress.Forecast
	update   progress.Update
	begun    time.Time
	first    int           // the step where this session began
	before   time.Duration // of earlier sessions
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
	if s.writer, err = chainfile.Create(dir, s.identity(text), chainfile.Options{Interval: time.Duration(j.Run.Sampling.SyncInterval)}); err != nil {
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
	var err error
	if s.best, err = Best(j); err != nil {
		return nil, err
	}
	lo, hi := j.Space.Box()
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
	s.update = progress.Update{MaxSteps: sampling.MaxSteps, Goal: float64(sampling.EffectiveSamples), MaxElapsed: time.Duration(sampling.MaxTime)}
	s.meter = progress.New(stderr, progress.Detect(stderr, o.Quiet))
	return s, nil
}

func (s *session) walkers() int {
	if n := s.job.Run.Sampling.Walkers; n > 0 {
		return n
	}
	return sampler.DefaultWalkers(s.job.Space.Dim())
}

// Best finds the point of highest posterior density of a job.
func Best(j *job.Job) ([]float64, error) {
	lo, hi := j.Space.Box()
	best, _, err := sampler.Maximise(j.Posterior.Evaluator().LogDensity, lo, hi, j.Run.Sampling.Seed)
	if err != nil {
		return nil, j.Run.Errorf("prior", "no universe within the priors can be observed as these data were (%v); widen the priors", err)
	}
	return best, nil
}

// identity is all that the chain depends on.
func (s *session) identity(text []byte) chainfile.Run {
	sum := sha256.Sum256(text)
	r := chainfile.Run{Format: chainfile.Format, Seed: s.job.Run.Sampling.Seed, Ensembles: s.job.Run.Sampling.Ensembles,
		Walkers: s.walkers(), Every: s.job.Run.Sampling.RecordEvery,
		RunFile: chainfile.Input{Path: RunFileName, SHA256: hex.EncodeToString(sum[:])}}
	for _, p := range s.job.Space.Free() {
		r.Parameters = append(r.Parameters, p.Name)
	}
	for _, in := range s.job.Inputs {
		r.Inputs = append(r.Inputs, chainfile.Input(in))
	}
	return r
}

// run samples until the goal, a limit or an interruption.
func (s *session) run(ctx context.Context) (*result.Run, error) {
	sampling := s.job.Run.Sampling
	if limit := time.Duration(sampling.MaxTime); limit > 0 {
		var cancel context.CancelFunc
		ctx, cancel = context.WithTimeout(ctx, limit)
		defer cancel()
	}
	settings := sampler.Settings{Seed: sampling.Seed, Effective: float64(sampling.EffectiveSamples),
		MaxSteps: sampling.MaxSteps, Threads: s.options.Threads}
	outcome, err := sampler.Run(ctx, s.dense, s.chain, settings, s)
	s.Checked(outcome.Check)
	s.update.Left = 0
	s.meter.Close(s.update)
	if closing := s.writer.Close(err == nil && outcome.Stop == sampler.Converged); err == nil {
		err = closing
	}
	if err != nil {
		return nil, err
	}
	return &result.Run{Job: s.job, Chain: s.chain, Outcome: outcome, Best: s.best, Threads: s.options.Threads,
		Version: s.options.Version, Seconds: s.elapsed().Seconds()}, nil
}

func (s *session) elapsed() time.Duration { return s.before + time.Since(s.begun) }

// Advanced writes new rows down; see [sampler.Observer].
func (s *session) Advanced(step int, rows sampler.View) error {
	for i := range rows.Steps() {
		x, logp := rows.Step(i)
		err := s.writer.Append(chainfile.Step{Number: rows.Number(i), Accepted: rows.Accepted(i), X: x, LogP: logp})
		if err != nil {
			return err
		}
	}
	if s.meter.Due() {
		s.refresh(step)
		s.meter.Show(s.update)
	}
	return s.writer.Tick()
}

// refresh brings what changes between checks up to date.
func (s *session) refresh(step int) {
	u := &s.update
	u.Steps, u.Elapsed = step, s.elapsed()
	here := float64(step-s.first) * float64(s.job.Run.Sampling.Ensembles*s.walkers())
	u.EvaluationsPerSecond = here / time.Since(s.begun).Seconds()
	u.Left = s.forecast.Left(*u)
}

// Checked shows how far the chain is; see [sampler.Observer].
func (s *session) Checked(c sampler.Check) {
	u := &s.update
	u.Effective, u.RHat, u.Acceptance = c.ESS(), c.RHat(), c.Acceptance
	for i, p := range c.Parameters {
		if p.ESS == u.Effective {
			u.Slowest = s.job.Space.Free()[i].Name
		}
	}
	s.forecast.Observe(s.elapsed(), u.Effective)
	s.refresh(c.Step)
	s.writer.SetProgress(s.update)
}
