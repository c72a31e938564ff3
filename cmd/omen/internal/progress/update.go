package progress

import (
	"encoding/json"
	"fmt"
	"math"
	"strings"
	"time"
)

// Update is how far a run is. What is not known yet is zero, or NaN or
// infinite where it is a float64, and is not shown.
type Update struct {
	Steps, MaxSteps      int           // done, and at most (0 for no limit)
	Effective, Goal      float64       // samples of the slowest parameter
	Done                 float64       // of all that the goal takes, 0 to 1: what a bar shows
	Slowest              string        // its name
	RHat                 float64       // the largest
	Acceptance           float64       // fraction of moves
	EvaluationsPerSecond float64       // of the posterior density
	Elapsed, MaxElapsed  time.Duration // over all sessions, and at most (0 for no limit)
	Left                 time.Duration // as [Forecast] sees it
	Note                 string        // what else there is to say
}

// String is the update as a sentence: a line of a log.
func (u Update) String() string {
	var parts []string
	add := func(known bool, format string, a ...any) {
		if known {
			parts = append(parts, fmt.Sprintf(format, a...))
		}
	}
	add(u.MaxSteps == 0, "%d steps", u.Steps)
	add(u.MaxSteps > 0, "%d of at most %d steps", u.Steps, u.MaxSteps)
	switch {
	case u.Goal > 0 && u.Effective >= u.Goal:
		add(known(u.Effective), "%.0f effective samples (goal %.0f%s)", u.Effective, u.Goal, u.slowest(", %s is slowest"))
	default:
		add(known(u.Effective), "%s effective samples%s", u.share(" of "), u.slowest(" (%s is slowest)"))
	}
	add(known(u.RHat), "R-hat %.3f", u.RHat)
	add(known(u.Acceptance), "acceptance %.2f", u.Acceptance)
	add(known(u.EvaluationsPerSecond), "%s evaluations/s", count(u.EvaluationsPerSecond))
	add(u.Left > 0, "about %s left", span(u.Left))
	add(u.Note != "", "%s", u.Note)
	after := "after " + span(u.Elapsed)
	if u.MaxElapsed > 0 {
		after += " of at most " + span(u.MaxElapsed)
	}
	return after + ": " + strings.Join(parts, ", ")
}

// part is something to say beside a bar, in two lengths.
type part struct {
	long, short string
	rank        int // the highest goes first when there is no room
}

// words is what stands beside a bar, in the order it is read.
func (u Update) words() []part {
	parts := []part{{count(float64(u.Steps)) + " steps", count(float64(u.Steps)) + " steps", 5}}
	add := func(known bool, rank int, long, short string) {
		if known {
			parts = append(parts, part{long, short, rank})
		}
	}
	add(known(u.Effective), 1, u.share(" of ")+" effective"+u.slowest(" (%s)"), u.slowest("%s ")+u.share("/"))
	add(known(u.RHat), 4, fmt.Sprintf("R-hat %.3f", u.RHat), fmt.Sprintf("R %.3f", u.RHat))
	acc := fmt.Sprintf("%.0f%%", 100*u.Acceptance)
	add(known(u.Acceptance), 6, acc+" accepted", "acc "+acc)
	rate := count(u.EvaluationsPerSecond)
	add(known(u.EvaluationsPerSecond), 7, rate+" evaluations/s", rate+"/s")
	left := span(u.Left) + " left"
	add(u.Left > 0, 3, left, left)
	add(u.Note != "", 2, u.Note, u.Note)
	return parts
}

// fit joins parts to at most width columns: in full, or shortened, or with
// the least important left out.
func fit(parts []part, width int) string {
	long, short := join(parts)
	for len([]rune(long)) > width && len([]rune(short)) > width && len(parts) > 1 {
		parts = without(parts)
		_, short = join(parts)
		long = short
	}
	if len([]rune(long)) <= width {
		return long
	}
	return short
}

func join(parts []part) (long, short string) {
	var l, s []string
	for _, p := range parts {
		l, s = append(l, p.long), append(s, p.short)
	}
	return strings.Join(l, ", "), strings.Join(s, ", ")
}

// without leaves out the part with the highest rank.
func without(parts []part) []part {
	worst := 0
	for i, p := range parts {
		if p.rank > parts[worst].rank {
			worst = i
		}
	}
	rest := append([]part{}, parts[:worst]...)
	return append(rest, parts[worst+1:]...)
}

// share is the effective samples, against the goal if there is one.
func (u Update) share(of string) string {
	s := fmt.Sprintf("%.0f", u.Effective)
	if u.Goal > 0 {
		s += fmt.Sprintf("%s%.0f", of, u.Goal)
	}
	return s
}

func (u Update) slowest(format string) string {
	if u.Slowest == "" {
		return ""
	}
	return fmt.Sprintf(format, u.Slowest)
}

func known(v float64) bool { return v > 0 && !math.IsInf(v, 0) }

// count is a number to three digits, with k, M and G for thousands.
func count(v float64) string {
	for _, unit := range []string{"", "k", "M"} {
		if v < 999.5 {
			return digits(v, unit)
		}
		v /= 1000
	}
	return digits(v, "G")
}

func digits(v float64, unit string) string {
	switch {
	case unit == "" || v >= 99.95:
		return fmt.Sprintf("%.0f%s", v, unit)
	case v >= 9.995:
		return fmt.Sprintf("%.1f%s", v, unit)
	}
	return fmt.Sprintf("%.2f%s", v, unit)
}

// span is a duration with as much detail as is of use.
func span(d time.Duration) string {
	d = max(0, d)
	switch {
	case 0 < d && d < time.Second:
		return fmt.Sprintf("%.1fs", d.Seconds())
	case d < time.Minute:
		return fmt.Sprintf("%ds", d/time.Second)
	case d < 10*time.Minute:
		return fmt.Sprintf("%dm%02ds", d/time.Minute, d%time.Minute/time.Second)
	case d < time.Hour:
		return fmt.Sprintf("%dm", d/time.Minute)
	case d < 48*time.Hour:
		return fmt.Sprintf("%dh%02dm", d/time.Hour, d%time.Hour/time.Minute)
	}
	return fmt.Sprintf("%dd%02dh", d/(24*time.Hour), d%(24*time.Hour)/time.Hour)
}

// updateJSON is an update as a file keeps it; durations are in seconds.
type updateJSON struct {
	Steps       int     `json:"steps"`
	MaxSteps    int     `json:"max_steps,omitempty"`
	Effective   float64 `json:"effective,omitempty"`
	Goal        float64 `json:"goal,omitempty"`
	Done        float64 `json:"done,omitempty"`
	Slowest     string  `json:"slowest,omitempty"`
	RHat        float64 `json:"rhat,omitempty"`
	Acceptance  float64 `json:"acceptance,omitempty"`
	Evaluations float64 `json:"evaluations_per_second,omitempty"`
	Elapsed     float64 `json:"elapsed"`
	MaxElapsed  float64 `json:"max_elapsed,omitempty"`
	Left        float64 `json:"left,omitempty"`
	Note        string  `json:"note,omitempty"`
}

// MarshalJSON encodes the update, without what is not known.
func (u Update) MarshalJSON() ([]byte, error) {
	return json.Marshal(updateJSON{u.Steps, u.MaxSteps, finite(u.Effective), finite(u.Goal), finite(u.Done), u.Slowest,
		finite(u.RHat), finite(u.Acceptance), finite(u.EvaluationsPerSecond),
		u.Elapsed.Seconds(), u.MaxElapsed.Seconds(), u.Left.Seconds(), u.Note})
}

// UnmarshalJSON is the inverse of MarshalJSON.
func (u *Update) UnmarshalJSON(b []byte) error {
	var j updateJSON
	if err := json.Unmarshal(b, &j); err != nil {
		return err
	}
	*u = Update{j.Steps, j.MaxSteps, j.Effective, j.Goal, j.Done, j.Slowest, j.RHat, j.Acceptance, j.Evaluations,
		seconds(j.Elapsed), seconds(j.MaxElapsed), seconds(j.Left), j.Note}
	return nil
}

func seconds(s float64) time.Duration { return time.Duration(math.Round(s * float64(time.Second))) }

// finite is v, or 0 where JSON has no number for it.
func finite(v float64) float64 {
	if v-v != 0 {
		return 0
	}
	return v
}
