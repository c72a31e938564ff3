// Package gather turns a run into what its figures and pages show.
//
//  1. Open reads the folder of a run, finished or not; Of takes one that has
//     just ended. Either gives a Run: the chain with its Summary.
//  2. Pictures lists the figures that make sense for it. Each has a caption, an
//     alternative text with the numbers in words, and draws itself at any width.
//
// It knows cosmology and chains and nothing of ink and paper: what it hands to
// package figure are plain numbers and labels. Everything is deterministic.
package gather

import (
	"context"
	"encoding/json"
	"os"
	"path/filepath"

	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/result"
	"omen/sampler"
)

// Run is a run with everything that is shown of it.
type Run struct {
	*result.Run
	Summary *result.Summary
	Dir     string
	RunFile []byte // the resolved run file
	Cut     string // why the chain was not read to its end, empty if it was
}

// Open reads the run in dir as it stands. Its summary is that of summary.json if
// it belongs to the chain as it is, and made anew if not. A chain that had to be cut
// short, for it is damaged, is the first of its warnings; without what its goal
// needs, the run is unfinished, even if it had once been finished.
func Open(ctx context.Context, dir string, o explore.Options) (*Run, error) {
	cut := ""
	o.Notice = func(text string) { cut = text }
	run, err := explore.Open(dir, o)
	if err != nil {
		return nil, err
	}
	if cut != "" && !run.Outcome.Check.Converged {
		run.Outcome.Stop = sampler.Interrupted
	}
	s, ok := kept(dir, run)
	if run.Chain == nil { // the figures are made from the integral
		if err := run.Investigate(ctx, nil); err != nil {
			return nil, err
		}
		if run.Exact == nil {
			return nil, ctx.Err()
		}
		s = result.Build(*run)
	} else if !ok {
		if run.Ended() == "" { // of an unfinished run the chain alone is told
			if err := run.Investigate(ctx, nil); err != nil {
				return nil, err
			}
		}
		s = result.Build(*run)
	}
	r, err := Of(run, s, dir)
	if err == nil && cut != "" {
		r.Cut, s.Warnings = cut, append([]string{cut}, s.Warnings...)
	}
	return r, err
}

// Of takes a run that has just ended.
func Of(run *result.Run, s *result.Summary, dir string) (*Run, error) {
	text, err := os.ReadFile(filepath.Join(dir, explore.RunFileName))
	if err != nil {
		return nil, err
	}
	return &Run{Run: run, Summary: s, Dir: dir, RunFile: text}, nil
}

// kept is the summary in dir, if this program made it from this chain.
func kept(dir string, run *result.Run) (*result.Summary, bool) {
	text, err := os.ReadFile(filepath.Join(dir, "summary.json"))
	if err != nil || run.Chain == nil {
		return nil, false
	}
	var s result.Summary
	if json.Unmarshal(text, &s) != nil || s.Schema != result.Schema || s.Version != run.Version {
		return nil, false
	}
	sampling := run.Job.Run.Sampling
	same := s.Sampling.Steps == run.Chain.Steps() && s.Sampling.Seed == sampling.Seed &&
		s.Sampling.Goal == sampling.EffectiveSamples && s.Complete == (run.Outcome.Stop == sampler.Converged)
	return &s, same
}

// Unfinished reports whether the run stopped before its goal.
func (r *Run) Unfinished() bool { return !r.Summary.Complete }

// sample is the part of the chain to draw from, thinned to about n draws.
func (r *Run) sample(n int) sampler.View {
	v := r.Outcome.Check.Sample
	rows := max(1, n/(v.Ensembles()*v.Walkers()))
	return v.Thin(max(1, v.Steps()/rows))
}

// effective is how many independent draws the density of points from an integral
// is smoothed as: more would show the lines that they lie on.
const effective = 4000

// draws is about n draws of each parameter, and how many independent ones they are
// worth. Without a chain they are points of equal weight from the integral.
func (r *Run) draws(n int) (columns [][]float64, ess float64) {
	columns = make([][]float64, r.Job.Space.Dim())
	if r.Chain == nil {
		for _, x := range r.Exact.Sample(n) {
			for i, v := range x {
				columns[i] = append(columns[i], v)
			}
		}
		return columns, effective
	}
	v := r.sample(n)
	for i := range columns {
		columns[i] = v.Coordinate(i).Values()
	}
	return columns, r.Outcome.Check.ESS()
}

// scatter is n positions spread evenly over the posterior.
func (r *Run) scatter(n int) [][]float64 {
	if r.Chain == nil {
		return r.Exact.Sample(n)
	}
	v := r.sample(4 * n)
	total := v.Ensembles() * v.Walkers() * v.Steps()
	n = min(n, total)
	out := make([][]float64, 0, n)
	k := 0
	for row := range v.Rows() {
		if k*n/total == len(out) {
			out = append(out, append([]float64(nil), row.X...))
		}
		k++
	}
	return out
}
