package outlook

import (
	"math"
	"runtime"
	"slices"
	"sort"
	"sync"
	"sync/atomic"

	"omen/model"
)

// Trace is the scale factor through time: of the best fit, and the bands that hold
// 68% and 95% of a posterior at each time. All slices have one length.
//
// In the bands a universe that has not begun yet, or is over, counts as 0, and one
// that was torn apart as +Inf. The best fit is NaN where it does not exist.
type Trace struct {
	Gyr    bool      // unit of Time: Gyr, or 1/H0 of the universe itself
	Time   []float64 // from today, ascending
	Best   []float64
	Median []float64
	Low68  []float64
	High68 []float64
	Low95  []float64
	High95 []float64
}

// tracePoints is how many times a trace has, not counting the moments that are added.
const tracePoints = 200

// Traces follows the best fit and a sample of equal weights, of which those without
// a big bang are left out. ahead is how far it looks, in units of 1/H0; 0 goes to the end of
// the best fit, or two Hubble times. Nil if the best fit had no big bang.
func Traces(best model.Universe, sample []model.Universe, gyr bool, ahead float64) *Trace {
	if !best.HasBigBang() {
		return nil
	}
	sample = slices.DeleteFunc(slices.Clone(sample), func(u model.Universe) bool { return !u.HasBigBang() })
	t := &Trace{Gyr: gyr, Time: times(best, sample, gyr, ahead)}
	t.Best = follow(best, t.Time, gyr)
	curves := make([][]float64, len(sample))
	var next atomic.Int64
	var group sync.WaitGroup
	for range runtime.GOMAXPROCS(0) {
		group.Go(func() {
			for i := int(next.Add(1)) - 1; i < len(sample); i = int(next.Add(1)) - 1 {
				curves[i] = follow(sample[i], t.Time, gyr)
				complete(sample[i], curves[i], t.Time, gyr)
			}
		})
	}
	group.Wait()
	t.bands(curves)
	return t
}

// unit is the unit of time in Gyr.
func unit(u model.Universe, gyr bool) float64 {
	if gyr {
		return 1
	}
	return u.HubbleTime()
}

// times is an even grid from the earliest big bang on, with the moments of the best
// fit and today among it.
func times(best model.Universe, sample []model.Universe, gyr bool, ahead float64) []float64 {
	g := unit(best, gyr)
	oldest := best.AgeToday() / g
	for _, u := range sample {
		oldest = math.Max(oldest, u.AgeToday()/unit(u, gyr))
	}
	marks := []float64{-best.AgeToday() / g, 0}
	end := 2 * best.HubbleTime() / g
	switch best.Future() {
	case model.Recollapse:
		_, turn := best.Turnaround()
		over := (best.Crunch() - best.AgeToday()) / g
		marks = append(marks, (turn-best.AgeToday())/g, over)
		end = math.Min(1.1*over, 20*best.HubbleTime()/g)
	case model.BigRip:
		end = math.Min(1.1*best.Rip()/g, 20*best.HubbleTime()/g)
	}
	if ahead > 0 {
		end = ahead * best.HubbleTime() / g
	}
	start := -1.02 * oldest
	for i := range tracePoints {
		marks = append(marks, start+(end-start)*float64(i)/(tracePoints-1))
	}
	slices.Sort(marks)
	marks = slices.Compact(marks)
	return marks[:sort.SearchFloat64s(marks, math.Nextafter(end, math.Inf(1)))]
}

// follow is the scale factor at times from today, NaN where there is none.
func follow(u model.Universe, times []float64, gyr bool) []float64 {
	age, g := u.AgeToday(), unit(u, gyr)
	since, a := make([]float64, len(times)), make([]float64, len(times))
	for i, t := range times {
		since[i] = age + t*g
	}
	u.History(since, a)
	return a
}

// complete replaces the times at which a universe does not exist.
func complete(u model.Universe, a, times []float64, gyr bool) {
	ripped := u.Rip() / unit(u, gyr)
	for i := range a {
		switch {
		case !math.IsNaN(a[i]):
		case times[i] >= ripped:
			a[i] = math.Inf(1)
		default:
			a[i] = 0
		}
	}
}

func (t *Trace) bands(curves [][]float64) {
	at := make([]float64, len(curves))
	for i := range t.Time {
		for k, c := range curves {
			at[k] = c[i]
		}
		slices.Sort(at)
		t.Median = append(t.Median, quantile(at, 0.5))
		t.Low68, t.High68 = append(t.Low68, quantile(at, 0.16)), append(t.High68, quantile(at, 0.84))
		t.Low95, t.High95 = append(t.Low95, quantile(at, 0.025)), append(t.High95, quantile(at, 0.975))
	}
}

// quantile of sorted values, between neighbours; NaN of none.
func quantile(x []float64, p float64) float64 {
	if len(x) == 0 {
		return math.NaN()
	}
	at := p*float64(len(x)) - 0.5
	i := min(max(int(math.Floor(at)), 0), len(x)-1)
	j := min(i+1, len(x)-1)
	if x[i] == x[j] || at <= 0 || math.IsInf(x[j], 0) {
		return x[i]
	}
	return x[i] + (at-float64(i))*(x[j]-x[i])
}
