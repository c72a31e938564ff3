package explore

import (
	"fmt"
	"path/filepath"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/runfile"
	"omen/sampler"
)

func walkers(j *job.Job) int {
	if n := j.Run.Sampling.Walkers; n > 0 {
		return n
	}
	return sampler.DefaultWalkers(j.Space.Dim())
}

// identity is all that the chain of a job depends on; text is the resolved run
// file.
func identity(j *job.Job, text []byte) (chainfile.Run, error) {
	hash, err := runfile.Identity(text)
	if err != nil {
		return chainfile.Run{}, err
	}
	r := chainfile.Run{Format: chainfile.Format, Seed: j.Run.Sampling.Seed, Ensembles: j.Run.Sampling.Ensembles,
		Walkers: walkers(j), Every: j.Run.Sampling.RecordEvery,
		RunFile: chainfile.Input{Path: RunFileName, SHA256: hash}}
	for _, p := range j.Space.Free() {
		r.Parameters = append(r.Parameters, p.Name)
	}
	for i, in := range j.Inputs {
		r.Inputs = append(r.Inputs, chainfile.Input{Path: label(j, i), SHA256: in.SHA256})
	}
	return r, nil
}

// label names an input without its folder, so that a run can be moved together
// with, or away from, what it reads.
func label(j *job.Job, i int) string {
	return fmt.Sprintf("%s (%s)", filepath.Base(j.Inputs[i].Path), keys(j.Run)[i])
}

// keys lists the keys that name inputs, in the order in which they are read.
func keys(r *runfile.Run) []string {
	var out []string
	for i, d := range r.Data {
		out = append(out, fmt.Sprintf("data.%d.table", i+1))
		if d.Covariance != "" {
			out = append(out, fmt.Sprintf("data.%d.covariance", i+1))
		}
		if d.Templates != "" {
			out = append(out, fmt.Sprintf("data.%d.templates", i+1))
		}
	}
	return out
}

// settle gives the job the run file as it is kept in dir, and its inputs the
// paths that stand there: a result does not depend on where it was started.
func settle(j *job.Job, dir string, text []byte) error {
	run, err := runfile.Parse(filepath.Join(dir, RunFileName), text, nil)
	if err != nil {
		return err
	}
	j.Run = run
	var paths []string
	for i, d := range run.Data {
		j.Tables[i].Spec = d
		paths = append(paths, d.Table)
		if d.Covariance != "" {
			paths = append(paths, d.Covariance)
		}
		if d.Templates != "" {
			paths = append(paths, d.Templates)
		}
	}
	for i, path := range paths {
		j.Inputs[i].Path = path
	}
	return nil
}
