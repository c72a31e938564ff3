package explore

import (
	"bytes"
	"context"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/job/jobtest"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
	"omen/sampler"

	"github.com/google/go-cmp/cmp"
)

func quiet() Options { return Options{Quiet: true, Version: "test"} }

// A run that is started, out of time, interrupted and resumed says the same as one
// that is not, but for the time it took.
func TestSessionsAddUp(t *testing.T) {
	whole, err := Start(t.Context(), jobtest.Committed(t, "bao-flat.toml"), filepath.Join(t.TempDir(), "run"), quiet(), io.Discard)
	if err != nil {
		t.Fatal(err)
	}
	dir := filepath.Join(t.TempDir(), "run")
	part, err := Start(t.Context(), jobtest.Committed(t, "bao-flat.toml", "sampling.max-time=20ms", "sampling.effective-samples=100000"), dir, quiet(), io.Discard)
	if err != nil || !part.OutOfTime || part.Ended() != "time limit" {
		t.Fatalf("%+v, %v", part, err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	part, err = Resume(ctx, dir, []string{"sampling.max-time=0s", "sampling.effective-samples=4000"}, quiet(), io.Discard)
	if err != nil || part.OutOfTime || part.Ended() != "interrupted" {
		t.Fatalf("%+v, %v", part, err)
	}
	last, err := Resume(t.Context(), dir, nil, quiet(), io.Discard)
	if err != nil || last.Ended() != "" {
		t.Fatalf("%+v, %v", last, err)
	}
	a, b := result.Build(*whole), result.Build(*last)
	a.Sampling.Seconds, b.Sampling.Seconds = 0, 0
	for _, in := range b.Inputs {
		if _, err := os.Stat(filepath.Join(dir, in.Path)); err != nil || filepath.IsAbs(in.Path) {
			t.Errorf("an input's path is not relative to the folder of the run: %s, %v", in.Path, err)
		}
	}
	a.Inputs, b.Inputs = nil, nil // relative to different folders
	var texts [2]bytes.Buffer
	if err := errors.Join(report.JSON(&texts[0], a), report.JSON(&texts[1], b)); err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(texts[0].String(), texts[1].String()); diff != "" {
		t.Error(diff)
	}
}

// Nothing is left of a run that was interrupted before its first step.
func TestInterruptedBeforeTheFirstStep(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	dir := filepath.Join(t.TempDir(), "run")
	if _, err := Start(ctx, jobtest.Committed(t, "bao-flat.toml"), dir, quiet(), io.Discard); !errors.Is(err, ErrTooEarly) {
		t.Error(err)
	}
	if _, err := os.Stat(dir); !errors.Is(err, os.ErrNotExist) {
		t.Error("a folder is left:", err)
	}
}

// What is left of a run that was killed while its folder was made is no obstacle;
// everything else is.
func TestFoldersThatAreTaken(t *testing.T) {
	for _, c := range []struct {
		name  string
		files map[string]string
		want  string
	}{
		{"empty", nil, ""},
		{"killed early", map[string]string{"run.toml": "x", "run.lock": "", "chain.csv": "ensemble\n", "run.json.new": "{"}, ""},
		{"a stranger's", map[string]string{"run.toml": "x", "thesis.tex": ""}, "is not empty"},
		{"a lost state", map[string]string{"run.toml": "x", "chain.csv": strings.Repeat("0,1,2\n", 10000)}, "is not empty"},
	} {
		dir := t.TempDir()
		for name, text := range c.files {
			if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		_, err := Start(t.Context(), jobtest.Committed(t, "bao-flat.toml", "sampling.max-steps=10"), dir, quiet(), io.Discard)
		var refused *Refused
		if (c.want == "") != (err == nil) || err != nil && (!errors.As(err, &refused) || !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%s: %v", c.name, err)
		}
		for name, text := range c.files {
			if b, err := os.ReadFile(filepath.Join(dir, name)); c.want != "" && string(b) != text {
				t.Errorf("%s: %s was touched: %v", c.name, name, err)
			}
		}
	}
}

// A new goal is the run's own from then on; its identity stays.
func TestNewGoalIsKept(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	if _, err := Start(t.Context(), jobtest.Committed(t, "bao-flat.toml", "sampling.max-steps=20"), dir, quiet(), io.Discard); err != nil {
		t.Fatal(err)
	}
	for _, sets := range [][]string{{"sampling.max-steps=40"}, nil} {
		done, err := Resume(t.Context(), dir, sets, quiet(), io.Discard)
		if err != nil {
			t.Fatal(err)
		}
		if done.Chain.Steps() != 40 || done.Job.Run.Sampling.MaxSteps != 40 || done.Outcome.Stop != sampler.StepLimit {
			t.Errorf("%v: %d steps of %d, %v", sets, done.Chain.Steps(), done.Job.Run.Sampling.MaxSteps, done.Outcome.Stop)
		}
	}
	var refused *Refused
	if _, err := Resume(t.Context(), dir, []string{"prior.Om=0.3"}, quiet(), io.Discard); !errors.As(err, &refused) {
		t.Error("a setting that is no goal:", err)
	}
}

// The clock of the forecast and of the rate, in a first and in a later session.
func TestProgressOfSessions(t *testing.T) {
	j := jobtest.Committed(t, "bao-flat.toml", "sampling.max-time=1h")
	dir := filepath.Join(t.TempDir(), "run")
	if err := os.Mkdir(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	s, err := newSession(j, dir, quiet(), io.Discard)
	if err != nil {
		t.Fatal(err)
	}
	if err := s.create(); err != nil {
		t.Fatal(err)
	}
	s.before = time.Hour
	s.prepare()
	s.first = 1000
	s.begun = time.Now().Add(-10 * time.Second)
	s.Checked(sampler.Check{Step: 2000, Acceptance: 0.4, Parameters: []sampler.Convergence{{ESS: 900, RHat: 1.1}, {ESS: 400, RHat: 1.2}}})
	u := s.update
	if u.Slowest != "hrd" || u.Effective != 400 || u.RHat != 1.2 || u.Steps != 2000 {
		t.Errorf("%+v", u)
	}
	if rate := u.EvaluationsPerSecond / (1000 * 128 / 10.); rate < 0.9 || rate > 1.01 {
		t.Errorf("%v evaluations per second", u.EvaluationsPerSecond)
	}
	// 400 samples in an hour: 3600 more take nine, but this session has one.
	if left := u.Left.Round(time.Minute); left != time.Hour || u.MaxElapsed != 2*time.Hour {
		t.Errorf("%v left of %v", left, u.MaxElapsed)
	}
	if err := s.writer.Close(false); err != nil {
		t.Fatal(err)
	}
	if state, err := chainfile.ReadState(dir); err != nil || !strings.Contains(string(state.Progress), `"slowest": "hrd"`) {
		t.Errorf("%s, %v", state.Progress, err)
	}
}

// Enough sees what the parameters do not show: that derived quantities or fates
// are not known well enough.
func TestEnough(t *testing.T) {
	j := jobtest.Committed(t, "bao.toml", "sampling.effective-samples=2000", "sampling.engine=chain")
	done, err := Start(t.Context(), j, filepath.Join(t.TempDir(), "run"), quiet(), io.Discard)
	if err != nil || done.Outcome.Stop != sampler.Converged {
		t.Fatal(done, err)
	}
	sample := done.Outcome.Check.Sample
	enough := result.Enough(j, 0)
	if !enough(sample) {
		t.Error("a run ended although its sample is not enough")
	}
	if few := sample.After(done.Chain.Steps() - 12); enough(few) {
		t.Errorf("%d steps of %d are enough", few.Steps(), sample.Steps())
	}
}
