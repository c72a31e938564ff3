// Package explore takes a job from its posterior to a chain: it finds the best
// fit, starts the ensembles around it, runs them until the goal is met, and keeps
// the chain in the run's folder so that nothing computed is lost.
//
//	Start   a new run in a new folder
//	Resume  the run in a folder goes on, as if it had never stopped
package explore

import (
	"context"
	"errors"
	"io"
	"slices"
	"time"

	"omen/cmd/omen/internal/cache"
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
	Cache   *cache.Cache // of what is slow to read; nil for none
	Notice  func(string) // is told by Open if a chain was cut short; nil for none
}

// Refused is a folder that a run cannot begin or go on in, for a reason that
// its user can mend.
type Refused struct{ Dir, Why string }

func (r *Refused) Error() string { return r.Dir + ": " + r.Why }

// ErrTooEarly is the error of a run that was interrupted before its first step.
var ErrTooEarly = errors.New("interrupted before the first step; there is no result")

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
	begun    time.Time     // when this session began to sample
	first    int           // the step where it began
	before   time.Duration // of earlier sessions
}

// newSession finds the best fit and places the walkers.
func newSession(j *job.Job, dir string, o Options, stderr io.Writer) (*session, error) {
	s := &session{job: j, dir: dir, options: o}
	sampling := j.Run.Sampling
	for range sampling.Ensembles {
		s.dense = append(s.dense, j.Posterior.Evaluator().LogDensity)
	}
	var err error
	if s.best, err = Best(j); err != nil {
		return nil, err
	}
	lo, hi := j.Space.Box()
	starts := make([][]float64, sampling.Ensembles)
	for m := range starts {
		if starts[m], err = sampler.Scatter(s.dense[m], s.best, lo, hi, walkers(j), sampling.Seed, m); err != nil {
			return nil, err
		}
	}
	if s.chain, err = sampler.NewChain(j.Space.Dim(), starts, sampling.RecordEvery, sampler.DefaultRecord); err != nil {
		return nil, err
	}
	s.meter = progress.New(stderr, progress.Detect(stderr, o.Quiet))
	return s, nil
}

// Best finds the point of highest posterior density of a job.
func Best(j *job.Job) ([]float64, error) {
	lo, hi := j.Space.Box()
	best, _, err := sampler.Maximise(j.Posterior.Evaluator().LogDensity, lo, hi, j.Run.Sampling.Seed)
	if err != nil {
		return nil, j.Run.Errorf("prior", "no universe within the priors can be observed as these data were; widen the priors, or check the errors and covariance of the tables")
	}
	return best, nil
}

// run samples until the goal, a limit or an interruption.
func (s *session) run(ctx context.Context) (*result.Run, error) {
	s.prepare()
	defer s.announce(ctx)()
	limited, cancel := s.limit(ctx)
	defer cancel()
	sampling := s.job.Run.Sampling
	settings := sampler.Settings{Seed: sampling.Seed, Effective: float64(sampling.EffectiveSamples),
		MaxSteps: sampling.MaxSteps, Threads: s.options.Threads, Enough: result.Enough(s.job, s.options.Threads)}
	outcome, err := sampler.Run(limited, s.dense, s.chain, settings, s)
	done := &result.Run{Job: s.job, Chain: s.chain, Outcome: outcome, Best: s.best, Threads: s.options.Threads,
		Version: s.options.Version, Seconds: s.elapsed().Seconds(),
		OutOfTime: outcome.Stop == sampler.Interrupted && err == nil && ctx.Err() == nil}
	if err = s.close(done, err); err == nil && s.chain.Steps() == 0 {
		err = ErrTooEarly
	}
	if err != nil {
		return nil, err
	}
	return done, nil
}

// prepare sets the clock and the goals.
func (s *session) prepare() {
	sampling := s.job.Run.Sampling
	s.begun, s.first = time.Now(), s.chain.Steps()
	s.update = progress.Update{Steps: s.first, MaxSteps: sampling.MaxSteps, Goal: float64(sampling.EffectiveSamples), Elapsed: s.before}
	if limit := time.Duration(sampling.MaxTime); limit > 0 {
		s.update.MaxElapsed = s.before + limit
	}
}

// limit bounds the time of this session.
func (s *session) limit(ctx context.Context) (context.Context, context.CancelFunc) {
	if limit := time.Duration(s.job.Run.Sampling.MaxTime); limit > 0 {
		return context.WithTimeout(ctx, limit)
	}
	return context.WithCancel(ctx)
}

// announce tells whoever interrupts the run what happens next; the function it
// returns ends that.
func (s *session) announce(ctx context.Context) func() {
	stop := context.AfterFunc(ctx, func() {
		s.meter.Message("stopping after the step under way; interrupt again to stop at once")
	})
	return func() { stop() }
}

// close shows how the run ended and closes its files.
func (s *session) close(done *result.Run, err error) error {
	if s.chain.Steps() > 0 {
		s.Checked(done.Outcome.Check)
	}
	s.update.Left, s.update.Note = 0, done.Ended()
	if err != nil {
		s.update.Note = "failed"
	}
	s.writer.SetProgress(s.update)
	s.meter.Close(s.update)
	closing := s.writer.Close(err == nil && done.Outcome.Stop == sampler.Converged)
	if err == nil {
		err = closing
	}
	return err
}

func (s *session) elapsed() time.Duration { return s.before + time.Since(s.begun) }

// Advanced writes new rows down; see [sampler.Observer].
func (s *session) Advanced(step int, rows sampler.View) error {
	s.refresh(step)
	for i := range rows.Steps() {
		x, logp := rows.Step(i)
		err := s.writer.Append(chainfile.Step{Number: rows.Number(i), Accepted: rows.Accepted(i), X: x, LogP: logp})
		if err != nil {
			return err
		}
	}
	s.meter.Show(s.update)
	return s.writer.Tick()
}

// refresh brings what changes between checks up to date.
func (s *session) refresh(step int) {
	u := &s.update
	u.Steps, u.Elapsed = step, s.elapsed()
	here := float64(step-s.first) * float64(s.job.Run.Sampling.Ensembles*walkers(s.job))
	u.EvaluationsPerSecond = here / time.Since(s.begun).Seconds()
	u.Left = s.forecast.Left(*u)
	s.writer.SetProgress(*u)
}

// Checked shows how far the chain is; see [sampler.Observer].
func (s *session) Checked(c sampler.Check) {
	u := &s.update
	u.Effective, u.RHat, u.Acceptance = c.ESS(), c.RHat(), c.Acceptance
	i := slices.IndexFunc(c.Parameters, func(p sampler.Convergence) bool { return p.ESS == u.Effective })
	if i >= 0 {
		u.Slowest = s.job.Space.Free()[i].Name
	}
	u.Done = c.Progress(u.Goal)
	s.forecast.Observe(s.elapsed(), u.Goal*u.Done)
	u.Note = ""
	if u.Effective >= u.Goal && c.Times < sampler.Trust {
		u.Note = "on until the errors are known"
	}
	s.refresh(c.Step)
}
