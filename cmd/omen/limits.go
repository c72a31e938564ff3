package main

import (
	"io"
	"runtime"
	"strconv"
	"time"

	"omen/cmd/omen/internal/cache"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/progress"

	"github.com/spf13/pflag"
)

// limits are the flags that fit and resume share.
type limits struct {
	effective, steps int
	time             time.Duration
	noReport         bool
	noCache          bool
	explore          explore.Options
}

func (l *limits) add(f *pflag.FlagSet) {
	f.IntVar(&l.effective, "effective-samples", 0, "goal: effective samples of the slowest parameter")
	f.DurationVar(&l.time, "max-time", 0, "stop after this long, such as 8h or 90m; 0: no limit")
	f.IntVar(&l.steps, "max-steps", 0, "stop at this many steps in all")
	f.BoolVar(&l.explore.Quiet, "quiet", false, "show no progress")
	f.BoolVar(&l.noReport, "no-report", false, "leave out figures and pages; the text and summary.json remain")
	f.BoolVar(&l.noCache, "no-cache", false, "factorise and condense anew, and keep nothing in the user's cache folder")
	f.IntVar(&l.explore.Threads, "threads", 0, "ensembles that run at the same time; 0: one per processor")
}

// check refuses a number of threads that means nothing, and takes no more than there
// are processors: others would wait.
func (l *limits) check() error {
	if l.explore.Threads < 0 {
		return usagef("--threads %d: expected 1 or more, or 0 for one per processor", l.explore.Threads)
	}
	l.explore.Threads = min(l.explore.Threads, runtime.GOMAXPROCS(0))
	return nil
}

// cache keeps what is slow to compute, unless it is not wanted.
func (l *limits) cache() *cache.Cache {
	if l.noCache {
		return nil
	}
	return cache.Default()
}

// tasks tells of what takes long, unless nobody wants to know.
func (l *limits) tasks(stderr io.Writer) *progress.Tasks {
	return progress.NewTasks(stderr, progress.Detect(stderr, l.explore.Quiet))
}

// sets are the flags that were given as settings of the run file.
func (l *limits) sets(f *pflag.FlagSet) []string {
	var out []string
	for _, key := range []struct{ name, value string }{
		{"effective-samples", strconv.Itoa(l.effective)},
		{"max-time", l.time.String()},
		{"max-steps", strconv.Itoa(l.steps)},
	} {
		if f.Changed(key.name) {
			out = append(out, "sampling."+key.name+"="+key.value)
		}
	}
	return out
}
