package gather

import (
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/job/jobtest"
)

// A chain that is cut in the middle of a row is shown as far as it goes, and the
// reader is told.
func TestDamagedChain(t *testing.T) {
	j, dir := jobtest.Committed(t, "bao-flat.toml"), filepath.Join(t.TempDir(), "run")
	j.Run.Sampling.MaxSteps = 200
	if _, err := explore.Start(t.Context(), j, dir, explore.Options{Quiet: true}, io.Discard); err != nil {
		t.Fatal(err)
	}
	told := func() bool {
		t.Helper()
		r, err := Open(t.Context(), dir, explore.Options{})
		if err != nil {
			t.Fatal(err)
		}
		return len(r.Summary.Warnings) > 0 && strings.HasPrefix(r.Summary.Warnings[0], "chain.csv: used up to step ")
	}
	if told() {
		t.Error("a whole chain is called damaged")
	}
	path := filepath.Join(dir, chainfile.ChainName)
	info, err := os.Stat(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(path, info.Size()/2); err != nil {
		t.Fatal(err)
	}
	if !told() {
		t.Error("nothing is said of the cut")
	}
}

// A run that had been finished and lost most of its chain since is unfinished again.
func TestDamagedAfterTheGoal(t *testing.T) {
	j, dir := jobtest.Committed(t, "bao-flat.toml"), filepath.Join(t.TempDir(), "run")
	j.Run.Sampling.EffectiveSamples = 1000
	if _, err := explore.Start(t.Context(), j, dir, explore.Options{Quiet: true}, io.Discard); err != nil {
		t.Fatal(err)
	}
	whole, err := Open(t.Context(), dir, explore.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if whole.Unfinished() || whole.Cut != "" {
		t.Errorf("whole: unfinished %t, cut %q", whole.Unfinished(), whole.Cut)
	}
	if err := os.Truncate(filepath.Join(dir, chainfile.ChainName), 400_000); err != nil {
		t.Fatal(err)
	}
	short, err := Open(t.Context(), dir, explore.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if !short.Unfinished() || !strings.HasPrefix(short.Cut, "chain.csv: used up to step ") {
		t.Errorf("cut: unfinished %t, cut %q", short.Unfinished(), short.Cut)
	}
}
