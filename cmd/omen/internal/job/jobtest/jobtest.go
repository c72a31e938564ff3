// Package jobtest loads the committed runs for tests of other packages.
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
	file := filepath.Join(filepath.Dir(here), "..", "..", "..", "..", "..", "testdata", "runs", name)
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
