package explore

import (
	"encoding/json"
	"io"
	"strings"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/progress"
	"omen/cmd/omen/internal/result"
	"omen/sampler"
)

// Open reads the run in dir as it stands: finished, stopped, or under way in
// another process. It changes nothing and needs no lock. A run by quadrature
// alone comes without a chain, and without its integral.
func Open(dir string, o Options) (*result.Run, error) {
	state, err := readState(dir)
	if err != nil {
		if r := chainless(dir, o); r != nil {
			return r, nil
		}
		return nil, err
	}
	j, text, err := reload(dir, nil, o.Cache)
	if err != nil {
		return nil, err
	}
	if err := unchanged(dir, state.Run, j, text); err != nil {
		return nil, err
	}
	s, err := newSession(j, dir, o, io.Discard)
	if err != nil {
		return nil, err
	}
	rec, err := chainfile.Recover(dir, state, func(step chainfile.Step) error {
		return s.chain.Append(step.Number, step.X, step.LogP, step.Accepted)
	})
	if err != nil {
		return nil, incomplete(dir, err)
	}
	o.tellCut(dir, rec)
	if s.chain.Steps() == 0 {
		return nil, &Refused{dir, "the run has not made a step yet; there is nothing to report"}
	}
	return s.opened(state), nil
}

// tellCut passes on that a chain was not read to its end. The end of a chain that is
// being written is half a step at times, which is nothing to tell.
func (o Options) tellCut(dir string, rec chainfile.Recovered) {
	if o.Notice == nil || rec.Notice() == "" {
		return
	}
	if _, running, err := chainfile.Running(dir); err == nil && running && rec.Lost == 0 {
		return
	}
	o.Notice(rec.Notice())
}

// chainless is the run in dir if it is one by quadrature alone, else nil.
func chainless(dir string, o Options) *result.Run {
	j, text, err := reload(dir, nil, o.Cache)
	if err != nil || j.Run.Sampling.Engine != "quadrature" || settle(j, dir, text) != nil {
		return nil
	}
	return &result.Run{Job: j, Threads: o.Threads, Version: o.Version}
}

// unchanged refuses a run whose inputs are no longer those of its chain.
func unchanged(dir string, was chainfile.Run, j *job.Job, text []byte) error {
	is, err := identity(j, text)
	if err != nil {
		return err
	}
	var list []string
	for _, c := range chainfile.Compare(was, is) {
		list = append(list, c.String())
	}
	if len(list) > 0 {
		return &Refused{dir, "this is no longer the run that was started: " + strings.Join(list, "; ") + "; put back what it was"}
	}
	return settle(j, dir, text)
}

// opened is the run as its folder tells it.
func (s *session) opened(state chainfile.State) *result.Run {
	sampling := s.job.Run.Sampling
	settings := sampler.Settings{Seed: sampling.Seed, Effective: float64(sampling.EffectiveSamples), MaxSteps: sampling.MaxSteps, Threads: s.options.Threads}
	r := &result.Run{Job: s.job, Chain: s.chain, Best: s.best, Threads: s.options.Threads, Version: s.options.Version, Seconds: state.Seconds}
	r.Outcome.Check = sampler.Assess(s.chain, settings)
	switch {
	case state.Finished:
		r.Outcome.Stop = sampler.Converged
	case s.chain.Steps() >= sampling.MaxSteps:
		r.Outcome.Stop = sampler.StepLimit
	}
	var last progress.Update
	if json.Unmarshal(state.Progress, &last) == nil { // a reason that cannot be read is no reason
		r.OutOfTime = last.Note == result.Run{OutOfTime: true}.Ended()
	}
	return r
}
