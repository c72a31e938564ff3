package progress

import "time"

// Forecast tells how long a run still takes. The zero value is ready.
//
// In equilibrium the effective samples grow in proportion to the steps after
// burn-in. Their rate is taken over the younger half of the time, from the
// first check after half of it to the last, so that burn-in, which gives
// none, is forgotten as the run goes on.
type Forecast struct{ checks []check }

type check struct {
	elapsed   time.Duration
	effective float64
}

// Observe is told the effective samples of the slowest parameter at a check.
// Checks come in the order of elapsed.
func (f *Forecast) Observe(elapsed time.Duration, effective float64) {
	if known(effective) {
		f.checks = append(f.checks, check{elapsed, effective})
	}
}

// Left returns the time from u.Elapsed until u.Goal is met, u.MaxSteps are
// done or u.MaxElapsed is over, whichever is first, and 0 if nothing can be
// told: too early, or late although the goal is not met.
func (f *Forecast) Left(u Update) time.Duration {
	left := f.toGoal(u)
	if u.MaxSteps > 0 && u.Steps > 0 {
		perStep := float64(u.Elapsed) / float64(u.Steps)
		left = earlier(left, duration(perStep*float64(u.MaxSteps-u.Steps)))
	}
	if u.MaxElapsed > 0 {
		left = earlier(left, u.MaxElapsed-u.Elapsed)
	}
	return left
}

func (f *Forecast) toGoal(u Update) time.Duration {
	if len(f.checks) == 0 {
		return 0
	}
	last, rate := f.checks[len(f.checks)-1], f.rate()
	if rate <= 0 {
		return 0
	}
	total := float64(last.elapsed) + (u.Goal-last.effective)/rate
	return max(0, duration(total-float64(u.Elapsed)))
}

// rate is in effective samples per nanosecond.
func (f *Forecast) rate() float64 {
	last := f.checks[len(f.checks)-1]
	var from check // the start of the run, unless there is a check to take
	for _, c := range f.checks {
		if c.elapsed >= last.elapsed/2 && c.elapsed < last.elapsed {
			from = c
			break
		}
	}
	if r := slope(from, last); r > 0 {
		return r
	}
	return slope(check{}, last)
}

func slope(a, b check) float64 {
	if b.elapsed <= a.elapsed {
		return 0
	}
	return (b.effective - a.effective) / float64(b.elapsed-a.elapsed)
}

// duration keeps what a hopeless rate forecasts within the type, at a century.
func duration(ns float64) time.Duration {
	const century = 100 * 365 * 24 * time.Hour
	return time.Duration(min(ns, float64(century)))
}

// earlier is the smaller of two times left, of those that are known.
func earlier(a, b time.Duration) time.Duration {
	switch {
	case a <= 0:
		return max(0, b)
	case b <= 0:
		return a
	}
	return min(a, b)
}
