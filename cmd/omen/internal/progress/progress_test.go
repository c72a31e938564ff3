package progress

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"os"
	"regexp"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// clock is a wall clock that may go either way.
type clock struct{ t time.Time }

func newMeter(w *bytes.Buffer, kind Kind, width int) (*Meter, *clock) {
	c := &clock{time.Date(2031, 5, 4, 3, 2, 1, 0, time.UTC)}
	m := New(w, kind)
	m.now = func() time.Time { return c.t }
	m.width = func() int { return width }
	m.last = c.t
	return m, c
}

func after(d time.Duration) Update {
	s := d.Seconds()
	return Update{
		Steps: int(20 * s), Effective: s, Goal: 4000, Done: s / 4000, Slowest: "Om", RHat: 1 + 9/s, Acceptance: 0.314,
		EvaluationsPerSecond: 412345, Elapsed: d, Left: 4000*time.Second - d,
	}
}

// run shows an update every interval, as a run of that length would.
func run(m *Meter, c *clock, length, interval time.Duration) {
	for d := interval; d <= length; d += interval {
		c.t = c.t.Add(interval)
		m.Show(after(d))
	}
}

func TestLines(t *testing.T) {
	var out bytes.Buffer
	m, c := newMeter(&out, Lines, 0)
	run(m, c, 3*time.Minute+20*time.Second, 100*time.Millisecond)
	m.Message("a prior edge is close\n")
	m.Close(Update{Steps: 80000, MaxSteps: 80000, Effective: 3990, Elapsed: 8 * time.Hour, MaxElapsed: 9 * time.Hour, RHat: math.Inf(1), Note: "stopped"})
	want := `after 5s: 100 steps, 5 of 4000 effective samples (Om is slowest), R-hat 2.800, acceptance 0.31, 412k evaluations/s, about 1h06m left
after 1m05s: 1300 steps, 65 of 4000 effective samples (Om is slowest), R-hat 1.138, acceptance 0.31, 412k evaluations/s, about 1h05m left
after 2m05s: 2500 steps, 125 of 4000 effective samples (Om is slowest), R-hat 1.072, acceptance 0.31, 412k evaluations/s, about 1h04m left
after 3m05s: 3700 steps, 185 of 4000 effective samples (Om is slowest), R-hat 1.049, acceptance 0.31, 412k evaluations/s, about 1h03m left
a prior edge is close
after 8h00m of at most 9h00m: 80000 of at most 80000 steps, 3990 effective samples, stopped
`
	if diff := cmp.Diff(want, out.String()); diff != "" {
		t.Error(diff)
	}
}

func TestSilent(t *testing.T) {
	var out bytes.Buffer
	m, c := newMeter(&out, Silent, 80)
	run(m, c, time.Hour, time.Minute)
	m.Message("hello")
	m.Close(after(time.Hour))
	if out.Len() > 0 || m.Due() {
		t.Errorf("%q", out.String())
	}
}

func TestBarFits(t *testing.T) {
	night := after(2480 * time.Second)
	night.Slowest, night.Left = "hrd", 7*time.Hour+59*time.Minute
	if got, want := bar(night, 79), "62% [###...] 49.6k steps, hrd 2480/4000, R 1.004, acc 31%, 412k/s, 7h59m left"; got != want {
		t.Errorf("a long night:\n%s, want\n%s", got, want)
	}
	u := after(2480 * time.Second)
	for width, want := range map[int]string{
		180: "62% [##################............] 49.6k steps, 2480 of 4000 effective (Om), R-hat 1.004, 31% accepted, 412k evaluations/s, 25m left",
		100: "62% [##################............] 49.6k steps, Om 2480/4000, R 1.004, acc 31%, 412k/s, 25m left",
		79:  "62% [#####....] 49.6k steps, Om 2480/4000, R 1.004, acc 31%, 412k/s, 25m left",
		60:  "62% [####...] 49.6k steps, Om 2480/4000, R 1.004, 25m left",
		40:  "62% [#####....] Om 2480/4000, 25m left",
		20:  "Om 2480/4000",
		8:   "Om 2480/",
	} {
		got := bar(u, width)
		if got != want {
			t.Errorf("%d columns:\n%s, want\n%s", width, got, want)
		}
		if len(got) > width {
			t.Errorf("%d columns: %d used", width, len(got))
		}
	}
}

func TestBarEnds(t *testing.T) {
	for effective, want := range map[float64]string{
		0:          "0% [..............................] 0 steps",
		math.NaN(): "0% [..............................] 0 steps",
		4000:       "100% [####################] 0 steps, 4000 of 4000 effective",
		1e9:        "100% [##############] 0 steps, 1000000000 of 4000 effective",
	} {
		if got := bar(Update{Effective: effective, Goal: 4000, Done: min(effective/4000, 1)}, 60); got != want {
			t.Errorf("%g: %q, want %q", effective, got, want)
		}
	}
	if got, want := bar(Update{Steps: 12, Effective: 5}, 79), "12 steps, 5 effective"; got != want {
		t.Errorf("without a goal: %q, want %q", got, want)
	}
}

// What a terminal shows: every write starts over on the last line, and a
// message pushes the bar down by a line.
func TestBarOnTerminal(t *testing.T) {
	var out bytes.Buffer
	m, c := newMeter(&out, Bar, 80)
	run(m, c, 10*time.Second, 10*time.Millisecond)
	if n := strings.Count(out.String(), "\r"); n < 45 || n > 51 {
		t.Errorf("%d bars in 10 seconds, want 5 a second", n)
	}
	m.Message("first\nsecond")
	m.Close(after(4000 * time.Second))
	screen := screen(out.String())
	want := []string{
		"first",
		"second",
		"100% [###################] 80.0k steps, Om 4000/4000, R 1.002, acc 31%, 412k/s",
		"",
	}
	if diff := cmp.Diff(want, screen); diff != "" {
		t.Error(diff)
	}
	if regexp.MustCompile(`\x1b\[[0-9;]*m`).Match(out.Bytes()) {
		t.Error("there is colour")
	}
}

// screen plays \r, \n and erase-to-the-end-of-line on an empty terminal.
func screen(s string) []string {
	lines := []string{""}
	for i := 0; i < len(s); i++ {
		last := &lines[len(lines)-1]
		switch {
		case strings.HasPrefix(s[i:], eraseLine):
			*last = ""
			i += len(eraseLine) - 1
		case s[i] == '\n':
			lines = append(lines, "")
		default:
			*last += s[i : i+1]
		}
	}
	return lines
}

func TestClockSetBack(t *testing.T) {
	var out bytes.Buffer
	m, c := newMeter(&out, Lines, 0)
	c.t = c.t.Add(-24 * time.Hour)
	run(m, c, 2*time.Minute, time.Second)
	if n := strings.Count(out.String(), "\n"); n != 2 {
		t.Errorf("%d lines in two minutes after the clock was set back a day:\n%s", n, out.String())
	}
}

type gone struct{}

func (gone) Write([]byte) (int, error) { return 0, errors.New("the terminal is gone") }

func TestManyGoroutinesAndNoTerminal(t *testing.T) {
	m := New(gone{}, Bar)
	var all sync.WaitGroup
	for range 4 {
		all.Go(func() {
			m.Show(after(time.Second))
			m.Message("hello")
		})
	}
	all.Wait()
	m.Close(after(time.Minute))
}

func TestDetect(t *testing.T) {
	if k := Detect(os.Stderr, true); k != Silent {
		t.Errorf("quiet: %d", k)
	}
	if k := Detect(&bytes.Buffer{}, false); k != Lines {
		t.Errorf("a buffer: %d", k)
	}
	f, err := os.Open(os.DevNull)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if k := Detect(f, false); k != Lines {
		t.Errorf("a file: %d", k)
	}
}

func TestWordsForNumbers(t *testing.T) {
	for v, want := range map[float64]string{
		0: "0", 7: "7", 999: "999", 999.6: "1.00k", 1234: "1.23k", 12345: "12.3k", 99960: "100k",
		412345: "412k", 1e6: "1.00M", 2.5e9: "2.50G", 1e13: "10000G",
	} {
		if got := count(v); got != want {
			t.Errorf("count(%g) = %s, want %s", v, got, want)
		}
	}
	for d, want := range map[time.Duration]string{
		-1: "0s", 59900 * time.Millisecond: "59s", 61 * time.Second: "1m01s", 600 * time.Second: "10m",
		3599 * time.Second: "59m", 8 * time.Hour: "8h00m", 47*time.Hour + 59*time.Minute: "47h59m", 50 * time.Hour: "2d02h",
	} {
		if got := span(d); got != want {
			t.Errorf("span(%v) = %s, want %s", d, got, want)
		}
	}
}

func TestJSON(t *testing.T) {
	u := after(100 * time.Second)
	u.MaxSteps, u.MaxElapsed, u.Note = 7, time.Hour, "a note"
	u.Left = 8030 * time.Millisecond // in binary a little less than 8.03 s
	b, err := json.Marshal(u)
	if err != nil {
		t.Fatal(err)
	}
	var back Update
	if err := json.Unmarshal(b, &back); err != nil || back != u {
		t.Errorf("%+v came back as %+v, %v", u, back, err)
	}
	u.RHat, u.Acceptance = math.Inf(1), math.NaN()
	if b, err = json.Marshal(u); err != nil || bytes.Contains(b, []byte("rhat")) {
		t.Errorf("%s, %v", b, err)
	}
}

func TestForecast(t *testing.T) {
	var f Forecast
	at := func(elapsed time.Duration, goal float64) time.Duration {
		return f.Left(Update{Elapsed: elapsed, Goal: goal}).Round(time.Millisecond)
	}
	check := func(what string, got, want time.Duration) {
		t.Helper()
		if got != want {
			t.Errorf("%s: %v left, want %v", what, got, want)
		}
	}
	check("nothing known", at(time.Second, 100), 0)
	// Burn-in until 100 s, then 2 effective samples a second.
	for _, s := range []int{25, 50, 100, 200, 400, 800} {
		f.Observe(time.Duration(s)*time.Second, max(1, 2*float64(s-100)))
	}
	f.Observe(900*time.Second, math.NaN())
	check("at the check", at(800*time.Second, 4000), 1300*time.Second)
	check("between checks", at(1000*time.Second, 4000), 1100*time.Second)
	check("overdue", at(3000*time.Second, 4000), 0)
	check("goal met, others not", at(800*time.Second, 1000), 0)
	check("no goal", at(800*time.Second, 0), 0)
	check("a hopeless goal", at(0, 1e300), 100*365*24*time.Hour)

	u := Update{Elapsed: 1000 * time.Second, Goal: 4000, Steps: 5000, MaxSteps: 6000}
	check("few steps left", f.Left(u), 200*time.Second)
	u.MaxElapsed = 1100 * time.Second
	check("little time left", f.Left(u), 100*time.Second)
	u.MaxElapsed, u.Steps = 900*time.Second, 6000
	check("all limits reached", f.Left(u), 1100*time.Second)

	f = Forecast{}
	f.Observe(100*time.Second, 50)
	check("one check", at(100*time.Second, 100), 100*time.Second)
	f.Observe(200*time.Second, 40)
	check("fewer than before", at(200*time.Second, 100), 300*time.Second)
}

// A goal that is passed is no share any more.
func TestPastTheGoal(t *testing.T) {
	u := Update{Steps: 900, Effective: 5200, Goal: 4000, Slowest: "OL", Elapsed: 400 * time.Millisecond, Note: "on until the errors are known"}
	want := "after 0.4s: 900 steps, 5200 effective samples (goal 4000, OL is slowest), on until the errors are known"
	if got := u.String(); got != want {
		t.Errorf("%q, want %q", got, want)
	}
}

// A task is told of once it has taken long, and leaves nothing on a terminal.
func TestTasks(t *testing.T) {
	for kind, want := range map[Kind]string{Silent: "", Lines: "integrating\n", Bar: "integrating ..." + eraseLine} {
		var out written
		tasks := NewTasks(&out, kind)
		tasks.Begin("too short to tell")()
		tasks.patience = 0
		end := tasks.Begin("integrating")
		for kind != Silent && out.String() == "" {
			time.Sleep(time.Millisecond)
		}
		end()
		end()
		if got := out.String(); got != want {
			t.Errorf("kind %d: %q, want %q", kind, got, want)
		}
	}
}

// written is a buffer that goroutines share.
type written struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (w *written) Write(p []byte) (int, error) {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.b.Write(p)
}

func (w *written) String() string {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.b.String()
}
