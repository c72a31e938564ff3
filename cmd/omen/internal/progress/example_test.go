package progress_test

import (
	"os"
	"time"

	"omen/cmd/omen/internal/progress"
)

// In a log, where a bar is of no use.
func Example() {
	m := progress.New(os.Stdout, progress.Detect(os.Stdout, false))
	m.Message("4 ensembles of 32 walkers")
	u := progress.Update{
		Steps: 5000, Effective: 1000, Goal: 4000, Slowest: "hrd",
		RHat: 1.013, Acceptance: 0.42, EvaluationsPerSecond: 412000, Elapsed: time.Minute,
	}
	var f progress.Forecast
	f.Observe(u.Elapsed, u.Effective)
	u.Left = f.Left(u)
	m.Close(u)
	// Output:
	// 4 ensembles of 32 walkers
	// after 1m00s: 5000 steps, 1000 of 4000 effective samples (hrd is slowest), R-hat 1.013, acceptance 0.42, 412k evaluations/s, about 3m00s left
}
