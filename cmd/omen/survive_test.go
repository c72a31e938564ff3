package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io/fs"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"syscall"
	"testing"
	"time"

	"omen/cmd/omen/internal/chainfile"

	"github.com/google/go-cmp/cmp"
)

// quick makes a run short, and makes it sync often: tens of times in its life.
var quick = []string{"--set", "sampling.sync-interval=20ms", "--effective-samples", "1500", "--no-report", "--quiet"}

// undisturbed is the folder of a quick run that nothing happened to, and what it
// said.
func undisturbed(t *testing.T) (dir, text string) {
	t.Helper()
	dir = filepath.Join(buildDir, "undisturbed")
	said := filepath.Join(buildDir, "undisturbed.txt")
	if _, err := os.Stat(said); err != nil {
		text, _ := must(t, 0, "", fitting(dir, quick...)...)
		write(t, []byte(text), said)
	}
	return dir, string(read(t, said))
}

// endless is a run that would go on for hours.
var endless = []string{"--set", "sampling.sync-interval=20ms", "--set", "sampling.record-every=10",
	"--effective-samples", "100000", "--max-steps", "100000000", "--no-report"}

func fitting(dir string, args ...string) []string {
	return append([]string{"fit", runFile("bao-flat.toml"), "-o", dir,
		"--set", "sampling.engine=chain", "--set", "fates.nested=false"}, args...)
}

// differing is what may differ between two runs of the same: how long they took,
// and the folders that they and their inputs are in.
var differing = regexp.MustCompile(`"seconds": [0-9.e+-]+| in [0-9.]+ s,|In [^:]*: |"path": "[^"]*/`)

// sameRun compares everything that two finished runs leave, and what they said.
func sameRun(t *testing.T, want, got string, wantText, gotText string) {
	t.Helper()
	for _, name := range []string{chainfile.ChainName, chainfile.SumsName} {
		if !bytes.Equal(read(t, want, name), read(t, got, name)) {
			t.Errorf("%s of %s is not that of an undisturbed run", name, got)
		}
	}
	texts := [2]string{string(read(t, want, "summary.json")) + wantText, string(read(t, got, "summary.json")) + gotText}
	for i := range texts {
		texts[i] = differing.ReplaceAllString(texts[i], "")
	}
	if diff := cmp.Diff(texts[0], texts[1]); diff != "" {
		t.Errorf("the reports differ (-undisturbed +%s):\n%s", got, diff)
	}
}

// start starts omen and waits until the chain in dir holds some bytes.
func start(t *testing.T, cmd *exec.Cmd, dir string, size int64) {
	t.Helper()
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if cmd.ProcessState == nil {
			cmd.Process.Kill()
			cmd.Wait()
		}
	})
	for began := time.Now(); ; time.Sleep(time.Millisecond) {
		state, err := chainfile.ReadState(dir)
		if err == nil && state.Bytes >= size {
			return
		}
		if time.Since(began) > time.Minute {
			t.Fatalf("no chain in %s after a minute", dir)
		}
	}
}

// started is an endless run under way in dir, with its stderr.
func started(t *testing.T, dir string) (*exec.Cmd, *bytes.Buffer) {
	t.Helper()
	cmd, stderr := omen(t, fitting(dir, endless...)...), &bytes.Buffer{}
	cmd.Stderr = stderr
	start(t, cmd, dir, 1<<16)
	return cmd, stderr
}

// killed runs omen and kills it after some time. It reports whether the run had
// ended by itself before.
func killed(t *testing.T, after time.Duration, args ...string) (ended bool) {
	t.Helper()
	cmd := omen(t, args...)
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	timer := time.AfterFunc(after, func() { cmd.Process.Kill() })
	err := cmd.Wait()
	timer.Stop()
	if code := cmd.ProcessState.ExitCode(); err != nil && code != -1 {
		t.Fatalf("omen %s: exit status %d", strings.Join(args, " "), code)
	}
	return err == nil
}

// testKills kills runs at random moments, some of them again and again, and
// compares what they come to with an undisturbed run.
func testKills(t *testing.T, runs int) {
	base := t.TempDir()
	want, wantText := undisturbed(t)
	began := time.Now()
	must(t, 0, "", fitting(filepath.Join(base, "timed"), quick...)...)
	length := time.Since(began)
	rng := rand.New(rand.NewPCG(4, 2026))
	kills := 0
	for i := range runs {
		dir := filepath.Join(base, fmt.Sprint(i))
		threads := []string{"--threads", fmt.Sprint(1 + i%2)}
		for range 1 + rng.IntN(3) {
			args := append([]string{"resume", dir, "--quiet", "--no-report"}, threads...)
			if _, err := os.Stat(filepath.Join(dir, chainfile.StateName)); err != nil {
				args = append(fitting(dir, quick...), threads...)
			}
			if !killed(t, time.Duration(rng.Float64()*float64(length)), args...) {
				kills++
			}
		}
		if _, err := os.Stat(filepath.Join(dir, chainfile.StateName)); err != nil {
			must(t, 0, "", append(fitting(dir, quick...), threads...)...)
		}
		text, _ := must(t, 0, "", append([]string{"resume", dir, "--quiet", "--no-report"}, threads...)...)
		sameRun(t, want, dir, wantText, text)
		os.RemoveAll(dir)
	}
	t.Logf("%d runs killed %d times", runs, kills)
	if kills < runs/2 {
		t.Errorf("only %d kills hit a run", kills)
	}
}

func TestKilledAndResumed(t *testing.T) { testKills(t, 4) }

func TestInterrupted(t *testing.T) {
	for _, signal := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM} {
		dir := filepath.Join(t.TempDir(), "run")
		var stderr, stdout bytes.Buffer
		cmd := omen(t, fitting(dir, quick[:len(quick)-1]...)...)
		cmd.Stdout, cmd.Stderr = &stdout, &stderr
		start(t, cmd, dir, 1<<16)
		cmd.Process.Signal(signal)
		cmd.Wait()
		check(t, cmd, 3, "unfinished (interrupted) after", stderr.String())
		has(t, signal.String(), stderr.String(), "interrupt again to stop at once", "omen resume "+dir+" goes on")
		has(t, signal.String(), string(read(t, dir, "summary.json")), `"complete": false`, "unfinished: interrupted after")
		has(t, signal.String(), stdout.String(), "UNFINISHED")
		text, _ := must(t, 0, "", "status", dir)
		has(t, "status", text, "it stopped (interrupted); omen resume "+dir+" goes on")
		text, _ = must(t, 0, "", "resume", dir, "--no-report")
		want, wantText := undisturbed(t)
		sameRun(t, want, dir, wantText, text)
	}
}

// The first signal leaves the run to finish its step and write its result; the
// second, sent until it is over, does not.
func TestInterruptedTwice(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	cmd, _ := started(t, dir)
	ended := make(chan error)
	go func() { ended <- cmd.Wait() }()
	cmd.Process.Signal(syscall.SIGINT)
	for alive := true; alive; {
		cmd.Process.Signal(syscall.SIGTERM)
		select {
		case <-ended:
			alive = false
		case <-time.After(100 * time.Microsecond):
		}
	}
	if ws := cmd.ProcessState.Sys().(syscall.WaitStatus); !ws.Signaled() || ws.Signal() != syscall.SIGTERM {
		t.Errorf("ended by %v", cmd.ProcessState)
	}
	text, _ := must(t, 0, "", "status", dir)
	has(t, "status", text, "not running")
	steps := chainState(t, dir).Step
	must(t, 3, "step limit", "resume", dir, "--max-steps", fmt.Sprint(steps+100), "--no-report")
	if is := chainState(t, dir).Step; is < steps+100 {
		t.Errorf("resumed from step %d, ended at %d", steps, is)
	}
}

func chainState(t *testing.T, dir string) chainfile.State {
	t.Helper()
	state, err := chainfile.ReadState(dir)
	if err != nil {
		t.Fatal(err)
	}
	return state
}

func TestLimits(t *testing.T) {
	base := t.TempDir()
	dir, want := filepath.Join(base, "run"), filepath.Join(base, "undisturbed")
	text, _ := must(t, 3, "unfinished (step limit) after 200 steps", fitting(dir, "--max-steps", "200", "--no-report")...)
	has(t, "the result", text, "UNFINISHED")
	must(t, 3, "unfinished (step limit) after 200 steps", "resume", dir, "--no-report")
	must(t, 3, "unfinished (time limit) after", "resume", dir, "--max-steps", "100000000", "--effective-samples", "100000", "--max-time", "30ms", "--no-report")
	text, _ = must(t, 0, "", "status", dir)
	has(t, "status", text, "it stopped (time limit); omen resume "+dir+" goes on")
	goal := []string{"--max-steps", "1000000", "--effective-samples", "12000", "--max-time", "0s", "--no-report"}
	got, _ := must(t, 0, "", append([]string{"resume", dir}, goal...)...)
	wantText, _ := must(t, 0, "", fitting(want, goal...)...)
	sameRun(t, want, dir, wantText, got)
	again, _ := must(t, 0, "", "resume", dir, "--no-report") // finished, and with the goal it was given last
	sameRun(t, want, dir, wantText, again)
	text, _ = must(t, 0, "", "status", dir)
	has(t, "status", text, dir+": finished\n")
}

func TestRefusals(t *testing.T) {
	base := t.TempDir()
	for _, name := range []string{"bao-flat.toml", "desi-dr2-bao.csv", "desi-dr2-bao.cov"} {
		write(t, read(t, runFile(name)), base, name)
	}
	dir := filepath.Join(base, "run")
	begin := []string{"fit", filepath.Join(base, "bao-flat.toml"), "-o", dir, "--max-steps", "100", "--no-report"}
	must(t, 3, "", begin...)
	must(t, 2, dir+": the folder holds a run already; go on with it by omen resume "+dir+", or choose another folder with -o", begin...)
	must(t, 2, "the folder exists and is not empty; choose another with -o", "fit", runFile("bao-flat.toml"), "-o", base)
	for _, none := range []string{base, filepath.Join(base, "nowhere")} {
		must(t, 2, none+": no run in this folder (no run.json); name the folder that omen fit made", "resume", none)
		must(t, 2, none+": no run in this folder (no run.json); name the folder that omen fit made", "status", none)
	}
	for _, c := range []struct{ file, old, new, words string }{
		{"../desi-dr2-bao.csv", "0.295", "0.296", "input desi-dr2-bao.csv (data.1.table): was SHA-256 "},
		{"../desi-dr2-bao.cov", "\n0", "\n0", ""},
		{"run.toml", "[0.01, 0.99]", "[0.01, 0.98]", "run file run.toml: was SHA-256 "},
		{"run.toml", "seed = 1", "seed = 2", "seed: was 1, is now 2"},
		{"run.json", `"chain_format": 2`, `"chain_format": 1`, "chain-format version: was 1, is now 2"},
		{"run.json", `"seed"`, `"sead`, "found broken JSON"},
		{"run.toml", "table = ", "tabel = ", "run.toml:"},
	} {
		if c.words == "" {
			continue
		}
		path := filepath.Join(dir, c.file)
		was := read(t, path)
		is := bytes.Replace(was, []byte(c.old), []byte(c.new), 1)
		if bytes.Equal(was, is) {
			t.Fatalf("%s: no %q", path, c.old)
		}
		write(t, is, path)
		status := 2
		if strings.HasSuffix(c.words, "JSON") {
			status = 1
		}
		must(t, status, c.words, "resume", dir)
		write(t, was, path)
	}
	must(t, 2, "omen resume "+dir+" goes on with it", "fit", dir)
	must(t, 2, base+" is a folder; name the run file in it, such as "+filepath.Join(base, "bao-flat.toml"), "fit", base)
	must(t, 2, "is a folder without a run file", "fit", t.TempDir())
	must(t, 2, "found a file, expected the folder of a run", "resume", filepath.Join(dir, "run.toml"))
	for _, name := range []string{chainfile.ChainName, chainfile.SumsName} {
		path := filepath.Join(dir, name)
		was := read(t, path)
		if err := os.Remove(path); err != nil {
			t.Fatal(err)
		}
		must(t, 2, dir+": "+name+" is missing; put it back from a copy", "resume", dir)
		must(t, 2, dir+": "+name+" is missing; put it back from a copy", "report", dir)
		write(t, was, path)
	}
	os.Remove(filepath.Join(base, "desi-dr2-bao.cov"))
	must(t, 2, "desi-dr2-bao.cov: no such file or directory", "resume", dir)
}

// A program that computes another posterior does not go on with a chain. Here it
// is the chain that differs, with checksums in order.
func TestOtherPosterior(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	must(t, 3, "", fitting(dir, "--max-steps", "20", "--no-report")...)
	state := chainState(t, dir)
	var steps []chainfile.Step
	_, err := chainfile.Recover(dir, state, func(s chainfile.Step) error {
		c := chainfile.Step{Number: s.Number, Accepted: s.Accepted}
		for e := range s.X {
			c.X = append(c.X, append([]float64{}, s.X[e]...))
			c.LogP = append(c.LogP, append([]float64{}, s.LogP[e]...))
		}
		steps = append(steps, c)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{chainfile.ChainName, chainfile.SumsName, chainfile.StateName} {
		os.Remove(filepath.Join(dir, name))
	}
	w, err := chainfile.Create(dir, state.Run, chainfile.Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, s := range steps {
		for e := range s.LogP {
			for k := range s.LogP[e] {
				s.LogP[e][k] += 2e-6
			}
		}
		if err := w.Append(s); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(false); err != nil {
		t.Fatal(err)
	}
	must(t, 2, "this program computes another posterior: log_posterior of walker 1 of ensemble 0 at step 1 was", "resume", dir)
}

func TestDamagedChains(t *testing.T) {
	want, wantText := undisturbed(t)
	chain := read(t, want, chainfile.ChainName)
	middle := len(chain) / 2
	flip := bytes.Clone(chain)
	flip[middle] ^= 1
	lines := bytes.SplitAfter(chain, []byte("\n"))
	gap := bytes.Join(append(append([][]byte{}, lines[:1+128*100]...), lines[1+128*101:]...), nil)
	for _, c := range []struct {
		name, words string
		chain       []byte
	}{
		{"cut", "chain.csv: used up to step ", chain[:middle]},
		{"rubbish", "chain.csv: used up to step ", append(bytes.Clone(chain), "0,1,2,rubbish"...)},
		{"changed", "recorded steps are missing that had been safe", flip},
		{"gap", "chain.csv: used up to step 100; dropped the ", gap},
		{"empty", "not one step is valid", nil},
	} {
		dir := want + "-" + c.name // where the paths in run.toml are good
		if err := os.CopyFS(dir, os.DirFS(want)); err != nil {
			t.Fatal(err)
		}
		write(t, c.chain, dir, chainfile.ChainName)
		if c.name == "empty" {
			must(t, 1, c.words, "resume", dir)
			continue
		}
		text, _ := must(t, 0, c.words, "resume", dir, "--quiet", "--no-report")
		sameRun(t, want, dir, wantText, text)
	}
}

func TestOneRunPerFolder(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	cmd, _ := started(t, dir)
	holder := fmt.Sprintf("%s: process %d on ", dir, cmd.Process.Pid)
	must(t, 1, holder, "resume", dir)
	must(t, 1, holder, fitting(dir)...)
	text, _ := must(t, 0, "", "status", dir)
	has(t, "status", text, fmt.Sprintf("running, process %d on ", cmd.Process.Pid), "of at most 100000000 steps", "last made safe: step ")
	cmd.Process.Kill()
	cmd.Wait()
	text, _ = must(t, 0, "", "status", dir)
	has(t, "status", text, "not running, it was killed; omen resume "+dir+" goes on")
	must(t, 3, "time limit", "resume", dir, "--max-time", "100ms", "--no-report") // takes the stale lock over
}

// A folder that is moved away while its run goes on ends the run; back in place,
// it goes on.
func TestFolderMovedWhileRunning(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	var stderr bytes.Buffer
	cmd := omen(t, fitting(dir, quick...)...)
	cmd.Stderr = &stderr
	start(t, cmd, dir, 1<<16)
	if err := os.Rename(dir, dir+"-moved"); err != nil {
		t.Fatal(err)
	}
	cmd.Wait()
	check(t, cmd, 1, "the folder was removed or renamed: put it back, then resume", stderr.String())
	if err := os.Rename(dir+"-moved", dir); err != nil {
		t.Fatal(err)
	}
	text, _ := must(t, 0, "", "resume", dir, "--no-report")
	want, wantText := undisturbed(t)
	sameRun(t, want, dir, wantText, text)
}

func TestFolderRemovedWhileRunning(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	cmd, stderr := started(t, dir)
	for os.RemoveAll(dir) != nil { // while files appear in it
	}
	cmd.Wait()
	check(t, cmd, 1, "the folder was removed or renamed", stderr.String())
}

// The clock was set back between two sessions: what is in the folder is from the
// future.
func TestClockSetBack(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	must(t, 3, "", fitting(dir, append(quick, "--max-steps", "300")...)...)
	var state map[string]any
	if err := json.Unmarshal(read(t, dir, chainfile.StateName), &state); err != nil {
		t.Fatal(err)
	}
	state["started"] = "2126-01-01T00:00:00Z"
	b, err := json.Marshal(state)
	if err != nil {
		t.Fatal(err)
	}
	write(t, b, dir, chainfile.StateName)
	future := time.Now().AddDate(100, 0, 0)
	entries, _ := os.ReadDir(dir)
	for _, e := range entries {
		os.Chtimes(filepath.Join(dir, e.Name()), future, future)
	}
	if text, _ := must(t, 0, "", "status", dir); strings.Contains(text, "ago") {
		t.Errorf("an age from a clock that was set back:\n%s", text)
	}
	text, _ := must(t, 0, "", "resume", dir, "--max-steps", "1000000", "--no-report")
	want, wantText := undisturbed(t)
	sameRun(t, want, dir, wantText, text)
}

// A reader of the output that goes away does not take the run with it.
func TestBrokenPipe(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	r, w, err := os.Pipe()
	if err != nil {
		t.Fatal(err)
	}
	cmd := omen(t, fitting(dir, quick[:len(quick)-1]...)...)
	cmd.Stdout, cmd.Stderr = w, w
	r.Close()
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	w.Close()
	cmd.Wait()
	if got := cmd.ProcessState.ExitCode(); got != 1 {
		t.Errorf("ended by %v", cmd.ProcessState)
	}
	if !chainState(t, dir).Finished {
		t.Error("the run did not go on to its goal")
	}
	read(t, dir, "summary.json")
}

// Figures and pages of a run that was interrupted are those of an undisturbed one.
func TestReportsAreTheSame(t *testing.T) {
	base := t.TempDir()
	dir, want := filepath.Join(base, "run"), filepath.Join(base, "undisturbed")
	must(t, 0, "", fitting(want, "--effective-samples", "1500")...)
	must(t, 3, "", fitting(dir, "--effective-samples", "1500", "--max-steps", "500")...)
	must(t, 0, "", "resume", dir, "--max-steps", "200000")
	files := map[string]string{}
	for _, root := range []string{want, dir} {
		err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
			name, _ := filepath.Rel(root, path)
			if err != nil || d.IsDir() || name == chainfile.StateName {
				return err
			}
			text := differing.ReplaceAllString(string(read(t, path)), "")
			if root == want {
				files[name] = text
			} else if was, ok := files[name]; !ok || was != text {
				t.Errorf("%s is not that of an undisturbed run", name)
			}
			delete(files, map[bool]string{true: "", false: name}[root == want])
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	for name := range files {
		t.Errorf("%s is missing", name)
	}
}

// A chain too short for an evidence costs the comparison, not the result.
func TestTooShortForEvidence(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "run")
	text, _ := must(t, 3, "unfinished (step limit) after 6 steps", "fit", runFile("bao-flat.toml"), "-o", dir,
		"--max-steps", "6", "--no-report", "--quiet", "--set", "sampling.engine=chain")
	has(t, "fit", unwrapped(text), "the nested universes were not compared: ", "are too few for the evidence")
}
