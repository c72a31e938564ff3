package chainfile

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

func testRun() Run {
	return Run{
		Format: Format, Seed: 7, Ensembles: 2, Walkers: 3, Every: 5,
		Parameters: []string{"Om", "hrd"},
		RunFile:    Input{"run.toml", strings.Repeat("ab", 32)},
		Inputs:     []Input{{"sn.csv", strings.Repeat("01", 32)}, {"sn.cov", strings.Repeat("23", 32)}},
	}
}

// testStep is recorded step i of a made-up chain, the same at every call.
func testStep(r Run, i int) Step {
	s := r.newStep()
	s.Number, s.Accepted = i*r.Every, i*i
	rng := rand.New(rand.NewPCG(r.Seed, uint64(i)))
	for e := range s.X {
		for j := range s.X[e] {
			s.X[e][j] = rng.NormFloat64() * math.Pow(10, float64(rng.IntN(12)-6))
		}
		for j := range s.LogP[e] {
			s.LogP[e][j] = -700 * rng.Float64()
		}
	}
	return s
}

const hourly = time.Hour

// write makes a chain of n steps in a new folder, closed properly.
func write(t testing.TB, r Run, n int) string {
	t.Helper()
	dir := t.TempDir()
	w, err := Create(dir, r, Options{Interval: hourly})
	if err != nil {
		t.Fatal(err)
	}
	appendSteps(t, w, 1, n)
	if err := w.Close(false); err != nil {
		t.Fatal(err)
	}
	return dir
}

func appendSteps(t testing.TB, w *Writer, from, to int) {
	t.Helper()
	for i := from; i <= to; i++ {
		if err := w.Append(testStep(w.state.Run, i)); err != nil {
			t.Fatal(err)
		}
	}
}

func read(t testing.TB, dir, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(dir, name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func put(t testing.TB, dir, name string, b []byte) {
	t.Helper()
	if err := os.WriteFile(filepath.Join(dir, name), b, 0o644); err != nil {
		t.Fatal(err)
	}
}

func state(t testing.TB, dir string) State {
	t.Helper()
	s, err := ReadState(dir)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// recoverSame recovers dir and requires that what comes back is the
// beginning of the chain of testStep.
func recoverSame(t testing.TB, dir string) (Recovered, error) {
	t.Helper()
	n := 0
	rec, err := Recover(dir, state(t, dir), func(s Step) error {
		n++
		if want := testStep(testRun(), n); !reflect.DeepEqual(s, want) {
			t.Fatalf("step %d came back as %v, want %v", n, s, want)
		}
		return nil
	})
	if rec.Steps != n || rec.Step != 5*n {
		t.Fatalf("%+v after %d steps", rec, n)
	}
	return rec, err
}

// resumeTo recovers dir, appends up to n steps and closes.
func resumeTo(t testing.TB, dir string, n int) Recovered {
	t.Helper()
	rec, err := recoverSame(t, dir)
	if err != nil {
		t.Fatal(err)
	}
	w, err := Resume(dir, state(t, dir), rec, Options{Interval: hourly})
	if err != nil {
		t.Fatal(err)
	}
	appendSteps(t, w, rec.Steps+1, n)
	if err := w.Close(true); err != nil {
		t.Fatal(err)
	}
	return rec
}

func TestRoundTrip(t *testing.T) {
	dir := write(t, testRun(), 20)
	rec, err := recoverSame(t, dir)
	if err != nil || rec.Steps != 20 || rec.Notice() != "" || rec.Dropped != 0 {
		t.Fatalf("%+v, %v", rec, err)
	}
	lines := strings.SplitAfter(string(read(t, dir, ChainName)), "\n")
	if want := "ensemble,step,walker,Om,hrd,log_posterior\n"; lines[0] != want {
		t.Errorf("header %q, want %q", lines[0], want)
	}
	if len(lines) != 1+20*2*3+1 || !strings.HasPrefix(lines[6], "1,5,2,") || !strings.HasPrefix(lines[7], "0,10,0,") {
		t.Errorf("rows are not in step-major order: %q, %q", lines[6], lines[7])
	}
}

func TestExactFloats(t *testing.T) {
	r := testRun()
	r.Ensembles, r.Walkers = 1, 4
	s := r.newStep()
	s.Number = r.Every
	s.X[0] = []float64{0, math.Copysign(0, -1), math.MaxFloat64, -math.SmallestNonzeroFloat64, 0.1, 1e21, 1.0 / 3, math.Pi}
	s.LogP[0] = []float64{-1e-300, 123456789012345678, 5e-324, 1}
	back := r.newStep()
	back.Number = r.Every
	if _, err := r.parseStep(string(r.appendStep(nil, s)), back); err != nil {
		t.Fatal(err)
	}
	for j, v := range s.X[0] {
		if math.Float64bits(v) != math.Float64bits(back.X[0][j]) {
			t.Errorf("%g came back as %g", v, back.X[0][j])
		}
	}
	if diff := cmp.Diff(s.LogP, back.LogP); diff != "" {
		t.Error(diff)
	}
}

// A chain cut at any byte, with the sums as they were, goes on to the bytes
// of an undisturbed run or is refused.
func TestCutAtEveryByte(t *testing.T) {
	const n = 4
	whole := write(t, testRun(), n)
	chain, sums := read(t, whole, ChainName), read(t, whole, SumsName)
	dir := write(t, testRun(), n)
	before := read(t, dir, StateName)
	for cut := range chain {
		put(t, dir, ChainName, chain[:cut])
		rec, err := recoverSame(t, dir)
		if want := completeSteps(chain[:cut]); rec.Steps != want || rec.Reason == "" {
			t.Fatalf("cut at %d: %+v, want %d steps", cut, rec, want)
		}
		if rec.Steps == 0 {
			if err == nil {
				t.Fatalf("cut at %d: not refused", cut)
			}
			continue
		}
		if rec.Lost != n-rec.Steps || rec.Bytes+rec.Dropped != int64(cut) {
			t.Fatalf("cut at %d: %+v", cut, rec)
		}
		if cut%97 != 0 { // syncing takes its time
			continue
		}
		resumeTo(t, dir, n)
		if !bytes.Equal(read(t, dir, ChainName), chain) || !bytes.Equal(read(t, dir, SumsName), sums) {
			t.Fatalf("cut at %d: the resumed chain differs", cut)
		}
		put(t, dir, StateName, before)
	}
}

func completeSteps(chain []byte) int {
	return max(0, bytes.Count(chain, []byte("\n"))-1) / 6
}

// A killed run leaves any part of what was written after the last sync, in
// either file.
func TestKilledAnywhere(t *testing.T) {
	const synced, n = 2, 4
	dir := write(t, testRun(), synced)
	before, safeChain, safeSums := read(t, dir, StateName), len(read(t, dir, ChainName)), len(read(t, dir, SumsName))
	whole := write(t, testRun(), n)
	chain, sums := read(t, whole, ChainName), read(t, whole, SumsName)
	for i := safeChain; i <= len(chain); i += 67 {
		for j := safeSums; j <= len(sums); j += 23 {
			put(t, dir, ChainName, chain[:i])
			put(t, dir, SumsName, sums[:j])
			put(t, dir, StateName, before)
			rec := resumeTo(t, dir, n)
			if want := min(completeSteps(chain[:i]), j/recordLen-1); rec.Steps != want || rec.Lost != 0 {
				t.Fatalf("killed at %d, %d: %+v, want %d steps", i, j, rec, want)
			}
			if !bytes.Equal(read(t, dir, ChainName), chain) || !bytes.Equal(read(t, dir, SumsName), sums) {
				t.Fatalf("killed at %d, %d: the resumed chain differs", i, j)
			}
		}
	}
}

// After a power cut the end of a file may be blocks of zeros or of rubbish.
func TestTrailingRubbish(t *testing.T) {
	whole := write(t, testRun(), 4)
	chain := read(t, whole, ChainName)
	for name, rubbish := range map[string][]byte{
		"zeros":          make([]byte, 4096),
		"text":           []byte("hello\nworld\n"),
		"half a row":     []byte("0,25,0,0.3"),
		"unsynced rows":  testRun().appendStep(nil, testStep(testRun(), 5)),
		"no line breaks": bytes.Repeat([]byte("x"), 1<<20),
		"rows again":     chain[len(testRun().header()):],
	} {
		t.Run(name, func(t *testing.T) {
			dir := write(t, testRun(), 4)
			put(t, dir, ChainName, append(bytes.Clone(chain), rubbish...))
			rec := resumeTo(t, dir, 4)
			if rec.Steps != 4 || rec.Dropped != int64(len(rubbish)) || rec.Lost != 0 {
				t.Errorf("%+v", rec)
			}
			if want := "before step 25 was confirmed"; !strings.Contains(rec.Notice(), want) {
				t.Errorf("notice %q, want %q in it", rec.Notice(), want)
			}
			if !bytes.Equal(read(t, dir, ChainName), chain) {
				t.Error("the rubbish is still there")
			}
		})
	}
}

func TestMissingStep(t *testing.T) {
	dir := write(t, testRun(), 6)
	lines := bytes.SplitAfter(read(t, dir, ChainName), []byte("\n"))
	put(t, dir, ChainName, bytes.Join(append(lines[:1+2*6:1+2*6], lines[1+3*6:]...), nil))
	rec, err := recoverSame(t, dir)
	if err != nil || rec.Steps != 2 || rec.Lost != 4 {
		t.Fatalf("%+v, %v", rec, err)
	}
	const want = `line 14: found "0,20,0,`
	if !strings.HasPrefix(rec.Reason, want) || !strings.Contains(rec.Notice(), "4 recorded steps are missing that had been safe") {
		t.Errorf("notice %q, want %q in it", rec.Notice(), want)
	}
	cut := read(t, dir, ChainName)[rec.Bytes:]
	resumeTo(t, dir, 6)
	if !bytes.Equal(read(t, dir, CutName), cut) {
		t.Error("what was cut off is not kept aside")
	}
}

// Every byte of the chain and of the sums, changed to another digit or
// letter, ends the chain before the step it belongs to.
func TestEveryByteChanged(t *testing.T) {
	dir := write(t, testRun(), 3)
	for _, name := range []string{ChainName, SumsName} {
		good := read(t, dir, name)
		for i, c := range good {
			bad := bytes.Clone(good)
			bad[i] = '0' + (c+1-'0')%10
			put(t, dir, name, bad)
			rec, err := recoverSame(t, dir)
			want := completeSteps(good[:i])
			if name == SumsName {
				want = max(0, i/recordLen-1)
			}
			if rec.Steps != want || rec.Reason == "" || (want == 0) != (err != nil) {
				t.Fatalf("byte %d of %s, %q → %q: %+v, %v, want %d steps", i, name, c, bad[i], rec, err, want)
			}
		}
		put(t, dir, name, good)
	}
}

// Files that belong together but end too early, as an old copy would.
func TestOlderCopy(t *testing.T) {
	dir, old := write(t, testRun(), 5), write(t, testRun(), 3)
	put(t, dir, ChainName, read(t, old, ChainName))
	put(t, dir, SumsName, read(t, old, SumsName))
	rec := resumeTo(t, dir, 5)
	if want := "used up to step 15, the end of the file: chain.csv and chain.sums both end there; 2 recorded steps are missing"; rec.Lost != 2 || !strings.Contains(rec.Notice(), want) {
		t.Errorf("notice %q, want %q", rec.Notice(), want)
	}
	put(t, dir, ChainName, nil)
	put(t, dir, SumsName, nil)
	if _, err := recoverSame(t, dir); err == nil {
		t.Error("empty files were not refused")
	}
}

func TestEndlessLine(t *testing.T) {
	dir := write(t, testRun(), 3)
	chain := read(t, dir, ChainName)
	put(t, dir, ChainName, append(chain[:len(chain)-200:len(chain)-200], bytes.Repeat([]byte("7"), 1<<20)...))
	rec, err := recoverSame(t, dir)
	if want := "a line of more than"; err != nil || rec.Steps != 2 || !strings.Contains(rec.Reason, want) {
		t.Errorf("%+v, %v, want %q", rec, err, want)
	}
}

func TestStoppedBeforeAnything(t *testing.T) {
	dir := write(t, testRun(), 0)
	put(t, dir, ChainName, []byte("ensem"))
	put(t, dir, SumsName, nil)
	if rec := resumeTo(t, dir, 2); rec.Steps != 0 || rec.Notice() == "" {
		t.Errorf("%+v", rec)
	}
	if rec, err := recoverSame(t, dir); err != nil || rec.Steps != 2 {
		t.Errorf("%+v, %v", rec, err)
	}
}

func TestForeignChain(t *testing.T) {
	other := testRun()
	other.Seed++
	a, b := write(t, testRun(), 3), write(t, other, 3)
	put(t, a, ChainName, read(t, b, ChainName))
	put(t, a, SumsName, read(t, b, SumsName))
	if rec, err := recoverSame(t, a); err == nil || !strings.Contains(rec.Reason, "does not belong to this run") {
		t.Errorf("%+v, %v", rec, err)
	}
	if err := os.Remove(filepath.Join(a, SumsName)); err != nil {
		t.Fatal(err)
	}
	if _, err := recoverSame(t, a); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("without %s: %v", SumsName, err)
	}
}

func TestVisitEndsRecovery(t *testing.T) {
	dir := write(t, testRun(), 3)
	stop := errors.New("the density says otherwise")
	n := 0
	if _, err := Recover(dir, state(t, dir), func(Step) error { n++; return stop }); err != stop || n != 1 {
		t.Errorf("%v after %d steps", err, n)
	}
}

func TestPathsJSONCannotHold(t *testing.T) {
	r := testRun()
	r.Inputs[0].Path = "sn\xff\xfe.csv"
	dir := write(t, r, 2)
	s := state(t, dir)
	if rec, err := Recover(dir, s, nil); err != nil || rec.Steps != 2 {
		t.Errorf("%+v, %v", rec, err)
	}
	if c := Compare(s.Run, r); c != nil {
		t.Error(c)
	}
}

func TestCompare(t *testing.T) {
	was := testRun()
	if c := Compare(was, testRun()); c != nil {
		t.Errorf("the same run: %v", c)
	}
	is := testRun()
	is.Format, is.Seed, is.Ensembles, is.Walkers, is.Every = Format+1, 8, 3, 4, 6
	is.Parameters = []string{"Om"}
	is.RunFile.SHA256 = strings.Repeat("cd", 32)
	is.Inputs = []Input{{"sn.csv", strings.Repeat("45", 32)}, {"bao.csv", strings.Repeat("67", 32)}}
	var got []string
	for _, c := range Compare(was, is) {
		got = append(got, c.String())
	}
	want := []string{
		fmt.Sprintf("chain-format version: was %d, is now %d", Format, Format+1),
		"seed: was 7, is now 8",
		"ensembles: was 2, is now 3",
		"walkers: was 3, is now 4",
		"parameters: was Om, hrd, is now Om",
		"steps between recorded steps: was 5, is now 6",
		"run file run.toml: was SHA-256 abababababab…, is now SHA-256 cdcdcdcdcdcd…",
		"input sn.csv: was SHA-256 010101010101…, is now SHA-256 454545454545…",
		"input sn.cov: was SHA-256 232323232323…, is now not read",
		"input bao.csv: was not read, is now SHA-256 676767676767…",
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
}

func TestReadStateErrors(t *testing.T) {
	dir := t.TempDir()
	if _, err := ReadState(dir); !errors.Is(err, fs.ErrNotExist) || !strings.Contains(err.Error(), "no run in this folder") {
		t.Errorf("empty folder: %v", err)
	}
	for content, want := range map[string]string{
		"":                         "broken JSON",
		`{"schema": "omen.run/9"}`: `found schema "omen.run/9", expected "omen.run/1"`,
		`{"schema": "omen.run/1"}`: "0 ensembles",
		`{"schema": "omen.run/1", "ensembles": 1, "walkers": 1, "every": 2, "parameters": ["Om"], "synced_step": 3}`: "synced step 3",
		`{"schema": "omen.run/1", "ensembles": 1, "walkers": 1, "every": 2, "parameters": ["O,m"]}`:                  `"O,m"`,
	} {
		put(t, dir, StateName, []byte(content))
		if _, err := ReadState(dir); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, want %q", content, err, want)
		}
	}
}

// FuzzRecover damages both files in any way: whatever comes back is the
// beginning of the chain that was written.
func FuzzRecover(f *testing.F) {
	r := testRun()
	dir := write(f, r, 3)
	chain, sums := read(f, dir, ChainName), read(f, dir, SumsName)
	f.Add(chain, sums)
	f.Add(chain[:300], sums)
	f.Add(chain, sums[:50])
	f.Add(append(bytes.Clone(chain), "0,20,0,1,1,1\n"...), sums)
	f.Add([]byte{}, []byte{})
	f.Fuzz(func(t *testing.T, c, s []byte) {
		got := r.header()
		rec, err := recoverFrom(bytes.NewReader(c), bytes.NewReader(s), r, func(s Step) error {
			got = r.appendStep(got, s)
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		if rec.Bytes > 0 && (!bytes.HasPrefix(chain, got) || rec.Bytes != int64(len(got))) {
			t.Fatalf("%+v: %q is not how the chain begins", rec, got)
		}
	})
}

func TestProgressInState(t *testing.T) {
	dir := t.TempDir()
	w, err := Create(dir, testRun(), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if err := w.SetProgress(map[string]int{"effective": 12}); err != nil {
		t.Fatal(err)
	}
	if err := w.SetProgress(math.NaN()); err == nil {
		t.Error("NaN was accepted")
	}
	appendSteps(t, w, 1, 1)
	var got map[string]int
	if err := json.Unmarshal(state(t, dir).Progress, &got); err != nil || got["effective"] != 12 {
		t.Errorf("%v, %v", got, err)
	}
	if err := w.Close(true); err != nil || !state(t, dir).Finished {
		t.Errorf("not finished: %v", err)
	}
}
