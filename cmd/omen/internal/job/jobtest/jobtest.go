// Package jobtest loads runs, the committed ones above all, for tests of other packages.
package jobtest

import (
	"os"
	"path/filepath"
	"runtime"
	"testing"

	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/runfile"
)

// Committed is a run of testdata/runs with settings on top, as --set has them.
func Committed(t testing.TB, name string, sets ...string) *job.Job {
	t.Helper()
	_, here, _, ok := runtime.Caller(0)
	if !ok {
		t.Fatal("the source is not where it was built")
	}
	return Load(t, filepath.Join(filepath.Dir(here), "..", "..", "..", "..", "..", "testdata", "runs", name), sets...)
}

// Load is the run of a file with settings on top.
func Load(t testing.TB, file string, sets ...string) *job.Job {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	run, err := runfile.Parse(file, text, sets)
	if err != nil {
		t.Fatal(err)
	}
	j, err := job.Load(run)
	if err != nil {
		t.Fatal(err)
	}
	return j
}
