package chainfile

import (
	"errors"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// clock is a wall clock without a monotonic reading, as after a restart.
type clock struct{ t time.Time }

func (c *clock) now() time.Time       { return c.t }
func (c *clock) pass(d time.Duration) { c.t = c.t.Add(d) }

func TestSyncsWhenTime(t *testing.T) {
	c := &clock{time.Date(2031, 5, 4, 3, 2, 1, 0, time.UTC)}
	dir := t.TempDir()
	w, err := Create(dir, testRun(), Options{Interval: DefaultInterval, Now: c.now})
	if err != nil {
		t.Fatal(err)
	}
	defer w.Close(false)
	expect := func(when string, step int, seconds float64) {
		t.Helper()
		s := state(t, dir)
		if s.Step != step || s.Seconds != seconds {
			t.Errorf("%s: synced step %d after %g s, want %d after %g s", when, s.Step, s.Seconds, step, seconds)
		}
		if info, err := w.chain.Stat(); err != nil || info.Size() < s.Bytes {
			t.Errorf("%s: %d bytes on disk, the state says %d", when, info.Size(), s.Bytes)
		}
	}
	appendSteps(t, w, 1, 2)
	expect("at once", 0, 0)
	c.pass(2 * time.Second)
	appendSteps(t, w, 3, 3)
	expect("too early", 0, 0)
	c.pass(time.Second)
	if err := w.Tick(); err != nil {
		t.Fatal(err)
	}
	expect("a tick in time", 15, 3)
	c.pass(-48 * time.Hour)
	appendSteps(t, w, 4, 4)
	expect("clock set back", 20, 3)
	c.pass(4 * time.Second)
	appendSteps(t, w, 5, 5)
	expect("going on", 25, 7)
}

func TestSecondsAddUp(t *testing.T) {
	c := &clock{time.Date(2031, 5, 4, 3, 2, 1, 0, time.UTC)}
	dir := t.TempDir()
	w, err := Create(dir, testRun(), Options{Interval: hourly, Now: c.now})
	if err != nil {
		t.Fatal(err)
	}
	c.pass(10 * time.Second)
	appendSteps(t, w, 1, 1)
	if err := w.Close(true); err != nil {
		t.Fatal(err)
	}
	c.pass(-time.Hour)
	rec, err := recoverSame(t, dir)
	if err != nil {
		t.Fatal(err)
	}
	if w, err = Resume(dir, state(t, dir), rec, Options{Interval: hourly, Now: c.now}); err != nil {
		t.Fatal(err)
	}
	if state(t, dir).Finished {
		t.Error("finished although it goes on")
	}
	c.pass(5 * time.Second)
	if err := w.Close(false); err != nil {
		t.Fatal(err)
	}
	if s := state(t, dir); s.Seconds != 15 || s.Finished {
		t.Errorf("%g s, finished %v, want 15 s, unfinished", s.Seconds, s.Finished)
	}
}

func TestRefusedNumbers(t *testing.T) {
	w, err := Create(t.TempDir(), testRun(), Options{Interval: hourly})
	if err != nil {
		t.Fatal(err)
	}
	defer w.Close(false)
	for _, v := range []float64{math.Inf(-1), math.Inf(1), math.NaN()} {
		s := testStep(testRun(), 1)
		s.LogP[1][2] = v
		if err := w.Append(s); err == nil {
			t.Errorf("%g was accepted as a log-posterior", v)
		}
		s = testStep(testRun(), 1)
		s.X[0][5] = v
		if err := w.Append(s); err == nil {
			t.Errorf("%g was accepted as a parameter", v)
		}
	}
	appendSteps(t, w, 1, 1)
}

func TestMisusePanics(t *testing.T) {
	w, err := Create(t.TempDir(), testRun(), Options{Interval: hourly})
	if err != nil {
		t.Fatal(err)
	}
	defer w.Close(false)
	short := testStep(testRun(), 1)
	short.X[1] = short.X[1][1:]
	for name, s := range map[string]Step{"a step is left out": testStep(testRun(), 2), "a number is left out": short} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("no panic when %s", name)
				}
			}()
			w.Append(s)
		}()
	}
}

func TestCreateRefuses(t *testing.T) {
	dir := write(t, testRun(), 1)
	if _, err := Create(dir, testRun(), Options{}); !errors.Is(err, fs.ErrExist) || !strings.Contains(err.Error(), "resume the run in this folder") {
		t.Errorf("a folder with a chain: %v", err)
	}
	if rec, err := recoverSame(t, dir); err != nil || rec.Steps != 1 {
		t.Errorf("the chain that was there: %+v, %v", rec, err)
	}
	bad := testRun()
	bad.Parameters[0] = "Om,OL"
	if _, err := Create(t.TempDir(), bad, Options{}); err == nil || !strings.Contains(err.Error(), `"Om,OL"`) {
		t.Errorf("a comma in a name: %v", err)
	}
}

func TestFolderRemoved(t *testing.T) {
	for name, remove := range map[string]func(dir string) error{
		"removed":  os.RemoveAll,
		"renamed":  func(dir string) error { return os.Rename(dir, dir+"-moved") },
		"replaced": func(dir string) error { return os.Rename(copyFolder(t, dir), dir) },
	} {
		t.Run(name, func(t *testing.T) {
			dir := filepath.Join(t.TempDir(), "out")
			if err := os.Mkdir(dir, 0o755); err != nil {
				t.Fatal(err)
			}
			w, err := Create(dir, testRun(), Options{})
			if err != nil {
				t.Fatal(err)
			}
			appendSteps(t, w, 1, 2)
			if err := remove(dir); err != nil {
				t.Fatal(err)
			}
			err = w.Append(testStep(testRun(), 3))
			if err == nil || !strings.Contains(err.Error(), "safe up to step 10; the folder was removed or renamed") {
				t.Fatalf("%v", err)
			}
			if again := w.Append(testStep(testRun(), 4)); again != err {
				t.Errorf("then: %v", again)
			}
			if closing := w.Close(false); !errors.Is(closing, err) {
				t.Errorf("closing: %v", closing)
			}
			if name == "renamed" {
				resumeTo(t, dir+"-moved", 5)
			}
		})
	}
}

// copyFolder moves dir away and returns a copy of it under another name.
func copyFolder(t *testing.T, dir string) string {
	away, twin := dir+"-away", dir+"-twin"
	if err := errors.Join(os.Rename(dir, away), os.CopyFS(twin, os.DirFS(away))); err != nil {
		t.Fatal(err)
	}
	return twin
}

// BenchmarkAppend writes steps of 4 × 32 rows of 2 parameters.
func BenchmarkAppend(b *testing.B) {
	r := testRun()
	r.Ensembles, r.Walkers, r.Every = 4, 32, 1
	w, err := Create(b.TempDir(), r, Options{Interval: DefaultInterval})
	if err != nil {
		b.Fatal(err)
	}
	s := testStep(r, 1)
	b.ReportAllocs()
	for i := 0; b.Loop(); i++ {
		s.Number = i + 1
		if err := w.Append(s); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(r.Ensembles*r.Walkers)*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
	if err := w.Close(true); err != nil {
		b.Fatal(err)
	}
}

func BenchmarkRecover(b *testing.B) {
	r := testRun()
	r.Ensembles, r.Walkers = 4, 32
	const n = 200
	dir := write(b, r, n)
	s := state(b, dir)
	for b.Loop() {
		if rec, err := Recover(dir, s, nil); err != nil || rec.Steps != n {
			b.Fatal(rec, err)
		}
	}
	b.ReportMetric(n*128*float64(b.N)/b.Elapsed().Seconds(), "rows/s")
}

func BenchmarkSync(b *testing.B) {
	w, err := Create(b.TempDir(), testRun(), Options{Interval: hourly})
	if err != nil {
		b.Fatal(err)
	}
	defer w.Close(false)
	for i := 1; b.Loop(); i++ {
		if err := errors.Join(w.Append(testStep(testRun(), i)), w.Sync()); err != nil {
			b.Fatal(err)
		}
	}
}
