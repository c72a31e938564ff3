package job

import (
	"bytes"
	"compress/gzip"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"omen/cmd/omen/internal/cache"
	"omen/cmd/omen/internal/runfile"
	"omen/likelihood"
)

// parse reads a run file with settings.
func parse(t testing.TB, file string, sets ...string) *runfile.Run {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	run, err := runfile.Parse(file, text, sets)
	if err != nil {
		t.Fatal(err)
	}
	return run
}

func fit(t testing.TB, run *runfile.Run, c *cache.Cache) *Job {
	t.Helper()
	j, err := LoadToFit(run, c)
	if err != nil {
		t.Fatal(err)
	}
	return j
}

func write(t testing.TB, name string, text []byte) {
	t.Helper()
	if err := os.WriteFile(name, text, 0o600); err != nil {
		t.Fatal(err)
	}
}

// survey writes an invented table of n supernovae with three systematics into a
// folder: as a matrix, and as templates.
func survey(t testing.TB, dir string, n int, scale float64) {
	random := rand.New(rand.NewPCG(3, 3))
	var table, templates, cov bytes.Buffer
	table.WriteString("z,mag,mag_err\n")
	templates.WriteString("calibration,dust,evolution\n")
	f := make([][3]float64, n)
	errs := make([]float64, n)
	for i := range n {
		z := 0.02 + 2.2*random.Float64()
		f[i] = [3]float64{0.02, math.Round(3000*math.Sin(3*z)) * 1e-5, math.Round(1000*random.NormFloat64()) * 1e-5}
		errs[i] = scale * math.Round(1000*(0.1+0.05*random.Float64())) * 1e-3
		fmt.Fprintf(&table, "%.6f,%.5f,%.6f\n", z, 24+5*math.Log10(z*(1+z/3))+errs[i]*random.NormFloat64(), errs[i])
		fmt.Fprintf(&templates, "%.5f,%.5f,%.5f\n", f[i][0], f[i][1], f[i][2])
	}
	fmt.Fprintln(&cov, n)
	for i := range n {
		for j := range n {
			v := f[i][0]*f[j][0] + f[i][1]*f[j][1] + f[i][2]*f[j][2]
			if i == j {
				v += errs[i] * errs[i]
			}
			fmt.Fprintln(&cov, v)
		}
	}
	write(t, filepath.Join(dir, "sn.csv"), table.Bytes())
	write(t, filepath.Join(dir, "sn.cov"), cov.Bytes())
	write(t, filepath.Join(dir, "templates.csv"), templates.Bytes())
	write(t, filepath.Join(dir, "run.toml"), []byte("[prior]\nOm = { flat = [0, 1] }\nOL = { flat = [0, 1.2] }\n"+
		"[[data]]\nkind = \"supernovae\"\ntable = \"sn.csv\"\ncovariance = \"sn.cov\"\n"))
}

// at is the log-density in a few places, by the condensed form and over all rows.
func at(j *Job) (out []float64) {
	e, d := j.Posterior.Evaluator(), j.Posterior.Direct().Evaluator()
	x := [][]float64{{0.3, 0.7}, {0.2, 0.5}, {0.9, 0.1}, {0.1, 1.18}}
	for _, p := range x {
		p = append(p, 70, -19.3)[:j.Space.Dim()]
		out = append(out, e.LogDensity(p), d.LogDensity(p))
	}
	return out
}

// A run with a cache, filled or not, damaged or not, has the same posterior to the
// last bit, and the same inputs.
func TestCacheChangesNothing(t *testing.T) {
	dir, kept := t.TempDir(), t.TempDir()
	survey(t, dir, 250, 1)
	run := parse(t, filepath.Join(dir, "run.toml"))
	plain := fit(t, run, nil)
	whole, err := Load(run)
	if err != nil {
		t.Fatal(err)
	}
	if whole.Tables[0].Matrix == nil || whole.Tables[0].Covariance == nil || plain.Tables[0].Matrix != nil {
		t.Error("matrices are kept where they are not wanted, or the other way round")
	}
	c := cache.Open(kept)
	same := func(what string) []string {
		t.Helper()
		j := fit(t, run, c)
		files, err := filepath.Glob(filepath.Join(kept, "*"))
		if err != nil || len(files) != 2 {
			t.Fatalf("%s: entries %v, want the factor and the condensed form", what, files)
		}
		got := at(j)
		for i, want := range at(plain) {
			if got[i] != want {
				t.Errorf("%s: log-density %v, want %v", what, got[i], want)
			}
		}
		if fmt.Sprint(j.Inputs) != fmt.Sprint(plain.Inputs) || fmt.Sprint(whole.Inputs) != fmt.Sprint(plain.Inputs) {
			t.Errorf("%s: inputs %v, want %v", what, j.Inputs, plain.Inputs)
		}
		return files
	}
	same("empty cache")
	for i, entry := range same("filled cache") {
		text, err := os.ReadFile(entry)
		if err != nil {
			t.Fatal(err)
		}
		write(t, entry, text[:len(text)/2])
		same(fmt.Sprintf("entry %d cut short", i))
		damaged := bytes.Clone(text)
		damaged[len(text)-3] ^= 1
		write(t, entry, damaged)
		same(fmt.Sprintf("entry %d damaged", i))
		if err := os.Remove(entry); err != nil {
			t.Fatal(err)
		}
		same(fmt.Sprintf("entry %d removed", i))
	}
}

// Once a job is loaded, nothing of it depends on what becomes of its files.
func TestCacheNeedsNoFilesLater(t *testing.T) {
	dir, kept := t.TempDir(), t.TempDir()
	survey(t, dir, 250, 1)
	run := parse(t, filepath.Join(dir, "run.toml"))
	want := at(fit(t, run, cache.Open(kept)))
	j := fit(t, run, cache.Open(kept))
	for _, folder := range []string{dir, kept} {
		if err := os.RemoveAll(folder); err != nil {
			t.Fatal(err)
		}
	}
	for i, got := range at(j) {
		if got != want[i] {
			t.Errorf("log-density %v, want %v", got, want[i])
		}
	}
}

// spy is a memory that shows what was looked up.
type spy struct{ key []float64 }

func (s *spy) Recall(key []float64) ([]float64, bool) { s.key = key; return nil, false }
func (s *spy) Keep([]float64, []float64)              {}

// A hit neither parses the matrix nor condenses the table: forged entries under the
// right keys are believed, each where it is used.
func TestCacheIsUsed(t *testing.T) {
	dir := t.TempDir()
	survey(t, dir, 250, 1)
	run := parse(t, filepath.Join(dir, "run.toml"))
	c := cache.Open(t.TempDir())
	first := fit(t, run, c)
	want := at(first)
	j := &Job{Run: run, cache: c}
	table := &Table{Spec: run.Data[0]}
	if err := j.open("data.1.table", "sn.csv", table.read); err != nil {
		t.Fatal(err)
	}
	sum, err := j.sum("data.1.covariance", "sn.cov")
	if err != nil {
		t.Fatal(err)
	}
	factor := factorKey(table, sum)
	var seen spy
	sn, err := likelihood.NewSupernovae(table.Supernovae, nil, likelihood.Offset{}, likelihood.Standing{})
	if err != nil {
		t.Fatal(err)
	}
	sn.Remember(&seen)
	if _, err := likelihood.NewPosterior(first.Space, sn); err != nil {
		t.Fatal(err)
	}
	for which, key := range []cache.Key{memory{c, factor}.key(seen.key), factor} {
		x, ok := c.Get(key)
		if !ok {
			t.Fatalf("no entry under key %d", which)
		}
		x[0] *= 2
		if err := c.Put(key, x); err != nil {
			t.Fatal(err)
		}
		got := at(fit(t, run, c))
		if got[0] == want[0] || (got[1] == want[1]) != (which == 0) {
			t.Errorf("entry %d forged: %v, was %v", which, got, want)
		}
	}
}

// Whatever changes in an input, or in what is made of it, the cache does not answer
// for what it was.
func TestCacheKnowsItsInputs(t *testing.T) {
	dir := t.TempDir()
	survey(t, dir, 300, 1)
	file := filepath.Join(dir, "run.toml")
	c := cache.Open(t.TempDir())
	cov, err := os.ReadFile(filepath.Join(dir, "sn.cov"))
	if err != nil {
		t.Fatal(err)
	}
	alone := []string{"data.1.covariance=none"}
	withTemplates := append([]string{"data.1.templates=templates.csv"}, alone...)
	digit := func(text []byte) { text[len(text)-2] ^= 1 } // the last one of a file
	replaced := func(name string, change func([]byte)) func() {
		return func() {
			text, err := os.ReadFile(filepath.Join(dir, name))
			if err != nil {
				t.Fatal(err)
			}
			change(text)
			write(t, filepath.Join(dir, name), text)
		}
	}
	var before []float64
	var zipped bytes.Buffer
	z := gzip.NewWriter(&zipped)
	z.Write(cov)
	z.Close()
	start := bytes.LastIndexByte(bytes.TrimSpace(cov), '\n') + 1 // of the last number
	other := append(bytes.Clone(cov[:start]), "0.5\n"...)
	for _, change := range []struct {
		name string
		sets []string
		do   func()
	}{
		{"nothing", nil, func() {}},
		{"a cut", []string{"data.1.keep=z > 0.1"}, func() {}},
		{"another cut", []string{"data.1.keep=z < 2.1"}, func() {}},
		{"added to the errors", []string{"data.1.covariance-holds=added"}, func() {}},
		{"an inverse", []string{"data.1.covariance-holds=inverse"}, func() {}},
		{"an offset", []string{"data.1.offset={ normal = [-19, 1] }", "prior.H0={ flat = [50, 90] }"}, func() {}},
		{"another offset", []string{"data.1.offset={ normal = [-19.1, 1] }", "prior.H0={ flat = [50, 90] }"}, func() {}},
		{"a narrower offset", []string{"data.1.offset={ normal = [-19, 0.5] }", "prior.H0={ flat = [50, 90] }"}, func() {}},
		{"no offset", []string{"data.1.offset=absolute", "prior.M={ flat = [-20, -19] }", "prior.H0={ flat = [50, 90] }"}, func() {}},
		{"templates", withTemplates, func() {}},
		{"templates and a cut", append([]string{"data.1.keep=z > 0.1"}, withTemplates...), func() {}},
		{"templates and another cut", append([]string{"data.1.keep=z < 2.1"}, withTemplates...), func() {}},
		{"one number of the templates", withTemplates, replaced("templates.csv", digit)},
		{"errors alone", alone, func() {}},
		{"one error alone", alone, replaced("sn.csv", digit)},
		{"one magnitude", nil, replaced("sn.csv", func(text []byte) { text[bytes.LastIndexByte(text, ',')-1] ^= 1 })},
		{"one number of the matrix", nil, func() { write(t, filepath.Join(dir, "sn.cov"), other) }},
		{"packed", nil, func() { write(t, filepath.Join(dir, "sn.cov"), zipped.Bytes()) }},
		{"other errors", []string{"data.1.covariance-holds=added"}, func() { survey(t, dir, 300, 1.5) }},
		{"fewer rows", nil, func() { survey(t, dir, 299, 1) }},
	} {
		change.do()
		run := parse(t, file, change.sets...)
		want := at(fit(t, run, nil))
		if slices.Equal(want, before) {
			t.Errorf("%s: log-density %v, as before", change.name, want)
		}
		before = want
		for _, which := range []string{"first", "second"} {
			for i, got := range at(fit(t, run, c)) {
				if got != want[i] {
					t.Errorf("%s, %s time: log-density %v, want %v", change.name, which, got, want[i])
				}
			}
		}
	}
}

// Templates are the covariance that they stand for.
func TestTemplates(t *testing.T) {
	dir := t.TempDir()
	survey(t, dir, 220, 1)
	file := filepath.Join(dir, "run.toml")
	for _, cut := range []string{"z > 0", "z > 0.3"} {
		a := fit(t, parse(t, file, "data.1.keep="+cut), nil)
		b := fit(t, parse(t, file, "data.1.keep="+cut, "data.1.covariance=none", "data.1.templates=templates.csv"), nil)
		if len(b.Inputs) != 2 || !strings.HasSuffix(b.Inputs[1].Path, "templates.csv") {
			t.Errorf("inputs %v", b.Inputs)
		}
		got := at(b)
		for i, want := range at(a) {
			if math.Abs(got[i]-want) > 1e-6 {
				t.Errorf("%s: log-density %v by templates, %v by the matrix", cut, got[i], want)
			}
		}
	}
	write(t, filepath.Join(dir, "short.csv"), []byte("a\n0.1\n"))
	write(t, filepath.Join(dir, "bare.csv"), []byte("z,mag\n0.1,20\n"))
	for _, c := range []struct {
		sets []string
		want string
	}{
		{[]string{"data.1.templates=none.csv"}, "none.csv: no such file"},
		{[]string{"data.1.templates=short.csv"}, "1 row"},
		{[]string{"data.1.templates=short.csv", "data.1.table=bare.csv"}, "bare.csv has no column of errors"},
	} {
		run := parse(t, file, append(c.sets, "data.1.covariance=none")...)
		if _, err := LoadToFit(run, nil); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v: got %v, want %q", c.sets, err, c.want)
		}
	}
}
