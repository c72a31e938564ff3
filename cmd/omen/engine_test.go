package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"

	"omen/cmd/omen/internal/result"
	"omen/model"
)

// fitted runs omen fit and returns its folder and what it printed.
func fitted(t *testing.T, args ...string) (dir, text string, s *result.Summary) {
	t.Helper()
	dir = filepath.Join(t.TempDir(), "out")
	var stdout bytes.Buffer
	if err := run(context.Background(), append([]string{"fit", "--quiet", "--no-report", "-o", dir}, args...), &stdout, &bytes.Buffer{}); err != nil {
		t.Fatalf("omen fit %v: %v", args, err)
	}
	b, err := os.ReadFile(filepath.Join(dir, "summary.json"))
	if err != nil {
		t.Fatal(err)
	}
	s = new(result.Summary)
	if err := json.Unmarshal(b, s); err != nil {
		t.Fatal(err)
	}
	return dir, stdout.String(), s
}

func statement(t *testing.T, list []result.Fate, name string) result.Fate {
	t.Helper()
	i := slices.IndexFunc(list, func(f result.Fate) bool { return f.Name == name })
	if i < 0 {
		t.Fatalf("no %q among %+v", name, list)
	}
	return list[i]
}

// Chain and quadrature agree to 0.02 of the width in means, widths, medians and the
// ends of all intervals, which takes a chain of 80,000 effective samples: the ends of
// the intervals are then known to 0.006, and the worst of some forty is 0.010 to 0.013
// off (measured with four seeds).
func TestChainAgainstQuadrature(t *testing.T) {
	_, _, s := fitted(t, runsFile("fate.toml"), "--effective-samples", "80000", "--set", "fates.nested=false")
	d := s.Engine.Largest
	if s.Engine.Name != "both" || d == nil || !(d.Widths > 0 && d.Widths < 0.02) || !(d.Sigmas < 5) || !(d.MonteCarlo > 0) {
		t.Errorf("engine %s: %+v", s.Engine.Name, d)
	}
	if got, want := len(s.Engine.Exact), len(s.Parameters)+len(s.Derived); got != want {
		t.Errorf("%d quantities were integrated of %d", got, want)
	}
	if c := statement(t, s.Today, "closed (Ok < 0)"); !c.Exact || c.Chain == nil ||
		!(math.Abs(float64(c.Probability-c.Chain.Probability)) < 5*float64(c.Chain.Error)) {
		t.Errorf("closed: %+v, chain %+v", c, c.Chain)
	}
}

// rareRun writes a run file with distances that leave a recollapse a chance of 1.146e-8:
// 60 moduli of 0.0488 mag, as package exact's test has them, where the number comes from.
func rareRun(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	u := model.Universe{Om: 0.3, OL: 0.7, W0: -1, H0: 70}
	var table strings.Builder
	table.WriteString("z,mu,mu_err\n")
	for i := range 60 {
		z := 0.05 + 1.45*float64(i)/59
		fmt.Fprintf(&table, "%v,%v,0.0488\n", z, u.DistanceModulus(z, z))
	}
	text := "[universe]\nradiation = 0\n[prior]\nOm = { flat = [0, 2] }\nOL = { flat = [-1, 2] }\n[[data]]\nkind = \"supernovae\"\ntable = \"sn.csv\"\n"
	for name, content := range map[string]string{"sn.csv": table.String(), "rare.toml": text} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return filepath.Join(dir, "rare.toml")
}

// A fate of 1 in 10⁸: quadrature gives it to 1%, the chain an upper limit, and both say so.
func TestRareFate(t *testing.T) {
	_, text, s := fitted(t, rareRun(t), "--set", "fates.nested=false")
	f := statement(t, s.Fates, model.Recollapse.String())
	if !f.Exact || math.Abs(float64(f.Probability)/1.146e-8-1) > 0.01 || !math.IsNaN(float64(f.Upper95)) {
		t.Errorf("P(recollapse) = %+v", f)
	}
	if c := f.Chain; c == nil || c.Probability != 0 ||
		!(math.Abs(float64(c.Upper95)*float64(s.Sampling.MinESS)/3-1) < 1e-6) || !(c.Upper95 < 3./4000) {
		t.Errorf("the chain says %+v", f.Chain)
	}
	for _, want := range []string{"1.1e-8", "1 - 1.1e-8", "< 0.000"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in\n%s", want, text)
		}
	}
}

// Quadrature alone: no chain, the same numbers, everything else in its place.
func TestQuadratureAlone(t *testing.T) {
	dir, text, s := fitted(t, runsFile("supernovae.toml"), "--set", "sampling.engine=quadrature")
	if s.Engine.Name != "quadrature" || s.Sampling != (result.Sampling{}) || !s.Complete {
		t.Errorf("engine %s, sampling %+v, complete %v", s.Engine.Name, s.Sampling, s.Complete)
	}
	if _, err := os.Stat(filepath.Join(dir, "chain.csv")); !os.IsNotExist(err) {
		t.Errorf("there is a chain: %v", err)
	}
	om := s.Parameters[0] // the widths of the issue that this run reproduces elsewhere, by grid
	if math.Abs(float64(om.Mean)-0.294) > 0.001 || math.Abs(float64(om.SD)-0.054) > 0.001 || !math.IsNaN(float64(om.ESS)) {
		t.Errorf("Om %+v", om)
	}
	if strings.Contains(text, "MC err") || strings.Contains(text, "Chain:") {
		t.Errorf("the text speaks of a chain:\n%s", text)
	}
	if err := run(context.Background(), []string{"fit", "-o", dir, runsFile("supernovae.toml")}, &bytes.Buffer{}, &bytes.Buffer{}); status(err) != 2 {
		t.Errorf("a second run in the folder: %v", err)
	}
}

// The chain alone has limits instead of small numbers, and bridge sampling for its evidence.
func TestChainAlone(t *testing.T) {
	_, _, s := fitted(t, runsFile("supernovae.toml"), "--set", "sampling.engine=chain")
	f := statement(t, s.Fates, model.Recollapse.String())
	if f.Exact || f.Chain != nil || f.Probability != 0 || !(f.Upper95 > 0) || s.Engine.Name != "chain" {
		t.Errorf("engine %s, P(recollapse) %+v", s.Engine.Name, f)
	}
	for _, m := range s.Nested {
		if m.Own && (m.Method != "bridge sampling" || math.Abs(float64(m.LogEvidence)+706.6226) > 4*float64(m.Error)) {
			t.Errorf("%s: %s, ln evidence %v ± %v, by quadrature -706.6226", m.Name, m.Method, m.LogEvidence, m.Error)
		}
	}
}

// Prior odds come from the run file, and the fates follow.
func TestOdds(t *testing.T) {
	_, text, s := fitted(t, runsFile("supernovae.toml"), "--set", "sampling.engine=quadrature", "--set", "fates.odds.flat-lambda=0")
	sum := 0.0
	for _, m := range s.Nested {
		sum += float64(m.Probability)
		if m.Name == "flat-lambda" && (m.Probability != 0 || m.Odds != 0) {
			t.Errorf("%+v", m)
		}
	}
	closed := statement(t, s.Averaged.Today, "closed (Ok < 0)")
	if math.Abs(sum-1) > 1e-9 || math.Abs(float64(closed.Probability)-0.2312) > 1e-3 {
		t.Errorf("probabilities add up to %v, P(closed) = %v", sum, closed.Probability)
	}
	if !strings.Contains(text, "flat, Λ 0") || !strings.Contains(text, "(odds 0)") {
		t.Errorf("the text does not tell the odds:\n%s", text)
	}
}

// history.csv: today is 1, bands are in order, and the columns are those it documents.
func TestHistory(t *testing.T) {
	dir, _, _ := fitted(t, runsFile("fate.toml"), "--set", "sampling.engine=quadrature", "--set", "fates.nested=false", "--set", "fates.ahead=3")
	b, err := os.ReadFile(filepath.Join(dir, "history.csv"))
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Contains(b, []byte("in 1/H0, for H0 is not known")) {
		t.Error("the unit is not told")
	}
	r := csv.NewReader(bytes.NewReader(b))
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(rows[0], " "); got != "time a_best a_median a_low68 a_high68 a_low95 a_high95" {
		t.Fatal(got)
	}
	number := func(s string) float64 {
		v, err := strconv.ParseFloat(s, 64)
		if err != nil {
			return math.NaN()
		}
		return v
	}
	today := false
	for _, row := range rows[1:] {
		v := make([]float64, len(row))
		for i, cell := range row {
			v[i] = number(cell)
		}
		if !(v[5] <= v[3] && v[3] <= v[2] && v[2] <= v[4] && v[4] <= v[6]) {
			t.Fatalf("bands cross: %v", row)
		}
		if v[0] == 0 {
			today = math.Abs(v[1]-1) < 1e-6 && math.Abs(v[5]-1) < 1e-6 && math.Abs(v[6]-1) < 1e-6
		}
	}
	if last := number(rows[len(rows)-1][0]); !today || math.Abs(last-3) > 1e-6 {
		t.Errorf("today is 1: %v; the last time is %v", today, last)
	}
}

// The published posterior of the Pantheon+ release (curved), as someone else's sample:
// mean and width as computed from it independently (0.296 ± 0.055, 0.611 ± 0.080, Ok
// 0.094 ± 0.130, P(Ok > 0) 0.76), every row accelerating, none recollapsing.
func TestPublishedSample(t *testing.T) {
	file := publicFile(t, "pantheonplus/published-posterior.csv")
	var s result.Summary
	if err := json.Unmarshal([]byte(output(t, "fate", "--json", "--samples", file, "--columns", "Om=Om,OL=OL")), &s); err != nil {
		t.Fatal(err)
	}
	got := map[string]result.Quantity{}
	for _, q := range append(s.Parameters, s.Derived...) {
		got[q.Name] = q
	}
	for name, w := range map[string]width{"Om": {0.296, 0.055}, "OL": {0.611, 0.080}, "Ok": {0.094, 0.130}} {
		q := got[name]
		if math.Abs(float64(q.Mean)-w.mean) > 0.05*w.sd || math.Abs(float64(q.SD)-w.sd) > 0.05*w.sd {
			t.Errorf("%s %.4f ± %.4f, want %.3f ± %.3f", name, float64(q.Mean), float64(q.SD), w.mean, w.sd)
		}
	}
	ess := float64(got["Om"].ESS)
	if !(ess > 20 && ess < 1000) { // 4480 rows of few walkers that take many steps to forget
		t.Errorf("effective samples %.0f", ess)
	}
	if f := statement(t, s.Fates, model.Recollapse.String()); f.Probability != 0 || !(f.Upper95 > 0) {
		t.Errorf("P(recollapse) %+v", f)
	}
	if f := statement(t, s.Today, "accelerating"); f.Probability != 1 {
		t.Errorf("P(accelerating) %+v", f)
	}
	if f := statement(t, s.Today, "open (Ok > 0)"); math.Abs(float64(f.Probability)-0.76) > 0.015 {
		t.Errorf("P(Ok > 0) %+v", f)
	}
	text := output(t, "fate", "--samples", file, "--H0", "70")
	if !strings.Contains(text, "age [Gyr]") || !strings.Contains(text, "independent draws") {
		t.Errorf("no age in Gyr, or no word on the worth of the sample:\n%s", text)
	}
}

// Weights count: a sample with weights is the sample with rows repeated.
func TestWeightedSample(t *testing.T) {
	write := func(text string) string {
		file := filepath.Join(t.TempDir(), "s.csv")
		if err := os.WriteFile(file, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		return file
	}
	var plain, weighted strings.Builder
	plain.WriteString("m,l\n")
	weighted.WriteString("m,l,n\n")
	for i := range 600 {
		om, ol, n := 0.2+0.3*math.Mod(float64(i)*0.618034, 1), 0.4+0.5*math.Mod(float64(i)*0.414214, 1), 1+i%3
		fmt.Fprintf(&weighted, "%g,%g,%d\n", om, ol, n)
		for range n {
			fmt.Fprintf(&plain, "%g,%g\n", om, ol)
		}
	}
	var a, b result.Summary
	for out, args := range map[*result.Summary][]string{
		&a: {"--samples", write(plain.String()), "--columns", "Om=m,OL=l"},
		&b: {"--samples", write(weighted.String()), "--columns", "Om=m,OL=l,weight=n"},
	} {
		if err := json.Unmarshal([]byte(output(t, append([]string{"fate", "--json"}, args...)...)), out); err != nil {
			t.Fatal(err)
		}
	}
	for i := range a.Parameters {
		x, y := a.Parameters[i], b.Parameters[i]
		if math.Abs(float64(x.Mean-y.Mean)) > 1e-12 || math.Abs(float64(x.SD-y.SD)) > 1e-12 {
			t.Errorf("%s: %v ± %v repeated, %v ± %v weighted", x.Name, x.Mean, x.SD, y.Mean, y.SD)
		}
	}
	x, y := statement(t, a.Today, "closed (Ok < 0)"), statement(t, b.Today, "closed (Ok < 0)")
	if math.Abs(float64(x.Probability-y.Probability)) > 1e-12 || !contains(b.Assumptions, "Kish") {
		t.Errorf("P(closed) %v repeated, %v weighted; %q", x.Probability, y.Probability, b.Assumptions)
	}
}

func TestEngineMistakes(t *testing.T) {
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"fit", runsFile("bao-w0wa.toml"), "--set", "sampling.engine=quadrature"}, `quadrature goes to 3 free parameters, this run has 4; choose engine = "chain"`},
		{[]string{"fit", runsFile("bao.toml"), "--set", "sampling.engine=grid"}, `sampling.engine: found "grid", expected one of both, chain, quadrature`},
		{[]string{"fit", runsFile("bao.toml"), "--set", "fates.odds.flat=1"}, `the nearest is "flat-w"`},
		{[]string{"fit", runsFile("bao.toml"), "--set", "fates.odds.critical=-1"}, "found -1, expected prior odds, 0 or more"},
		{[]string{"fit", runsFile("bao.toml"), "--set", "fates.ahead=-1"}, "fates.ahead: found -1"},
		{[]string{"fate", "--columns", "Om=a"}, "--columns maps the columns of --samples FILE, which is missing"},
		{[]string{"fate", "--samples", "none.csv"}, "cannot read none.csv"},
		{[]string{"fate", "--samples", "none.csv", "--Om", "0.3"}, "--samples brings its own Om"},
		{[]string{"fate", "--samples", runsFile("own-distances.csv")}, `column "Om": found no such column`},
		{[]string{"fate", "--samples", runsFile("own-distances.csv"), "--columns", "Om"}, `found "Om", expected name=column pairs`},
		{[]string{"fate", "--samples", runsFile("own-distances.csv"), "--columns", "OM=z"}, `did you mean "Om"?`},
	} {
		err := run(context.Background(), append(c.args, nothing(c.args[0], t)...), &bytes.Buffer{}, &bytes.Buffer{})
		if err == nil || !strings.Contains(err.Error(), c.want) || status(err) != 2 {
			t.Errorf("omen %v:\n got %v (status %d)\nwant %s", c.args, err, status(err), c.want)
		}
	}
}

// nothing keeps a fit that should have been refused out of the working folder.
func nothing(command string, t *testing.T) []string {
	if command != "fit" {
		return nil
	}
	return []string{"-o", filepath.Join(t.TempDir(), "out")}
}

// What is printed fits into 80 columns, with all its tables.
func TestTextFits(t *testing.T) {
	for _, args := range [][]string{
		{runsFile("fate.toml")},
		{runsFile("bao-w.toml"), "--set", "sampling.engine=quadrature"},
		{runsFile("supernovae.toml"), "--set", "sampling.engine=quadrature"},
	} {
		_, text, _ := fitted(t, args...)
		if i := strings.LastIndex(text, "\nIn "); i > 0 {
			text = text[:i] // a path may be long
		}
		for i, line := range strings.Split(text, "\n") {
			if n := utf8.RuneCountInString(line); n > 80 || strings.TrimRight(line, " ") != line {
				t.Errorf("%v: line %d has %d columns: %q", args, i+1, n, line)
			}
		}
		last := -1
		for _, title := range []string{"Parameters", "Derived", "Fate", "Today", "Nested universes", "Times", "Best fit", "Quadrature", "Assumed", "Warnings"} {
			at := strings.Index(text, "\n"+title)
			if at < 0 && title != "Warnings" || at >= 0 && at < last {
				t.Errorf("%v: %s at %d, after what stands at %d", args, title, at, last)
			}
			last = max(last, at)
		}
	}
}

// publicFile is a file of the public measurements; see DEVELOPERS.md. In CI a missing one
// is a failure.
func publicFile(t *testing.T, name string) string {
	t.Helper()
	dir := os.Getenv("OMEN_PUBLIC_DATA")
	if dir == "" {
		dir = filepath.Join("..", "..", "..", "shared", "data")
	}
	file := filepath.Join(dir, name)
	if _, err := os.Stat(file); err != nil {
		if os.Getenv("CI") != "" {
			t.Fatal(err)
		}
		t.Skipf("needs the public tables named in DEVELOPERS.md; put them in %s or set OMEN_PUBLIC_DATA", dir)
	}
	return file
}
