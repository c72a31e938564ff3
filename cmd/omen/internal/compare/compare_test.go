package compare

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
)

// fake is a run with one quantity.
func fake(t testing.TB, dir string, flat bool, mean, sd, ess float64, inputs ...string) *gather.Run {
	t.Helper()
	prior, err := likelihood.Flat(0, 1)
	if err != nil {
		t.Fatal(err)
	}
	f := likelihood.Family{Flat: flat, Free: []likelihood.Parameter{{Name: "Om", Prior: prior}}}
	if !flat {
		f.Fixed = map[string]float64{"OL": 0.7}
	}
	space, err := likelihood.NewSpace(f)
	if err != nil {
		t.Fatal(err)
	}
	s := &result.Summary{Complete: true, Parameters: []result.Quantity{{Name: "Om", Mean: result.Number(mean), SD: result.Number(sd), ESS: result.Number(ess), Constrained: true}}}
	for _, in := range inputs {
		s.Inputs = append(s.Inputs, result.InputFile{Path: dir + in, SHA256: in})
	}
	return &gather.Run{Run: &result.Run{Job: &job.Job{Space: space}}, Summary: s, Dir: dir}
}

// The rule follows what is in the files and the families, not the names.
func TestShift(t *testing.T) {
	for _, c := range []struct {
		name   string
		a, b   *gather.Run
		rule   Rule
		shared int
		want   float64
	}{
		{"nothing in common", fake(t, "a", true, 0.3, 0.03, 4000, "x"), fake(t, "b", true, 0.35, 0.04, 4000, "y"), Independent, 0, 1},
		{"more data, same family", fake(t, "a", true, 0.3, 0.03, 4000, "x", "y"), fake(t, "b", true, 0.34, 0.05, 4000, "y"), Nested, 1, 1},
		{"the other way round", fake(t, "a", true, 0.34, 0.05, 4000, "y"), fake(t, "b", true, 0.3, 0.03, 4000, "x", "y"), Nested, 1, -1},
		{"same data, wider family", fake(t, "a", true, 0.3, 0.03, 4000, "x"), fake(t, "b", false, 0.34, 0.05, 4000, "x"), Nested, 1, 1},
		{"more data and a wider family", fake(t, "a", false, 0.3, 0.03, 4000, "x", "y"), fake(t, "b", true, 0.35, 0.04, 4000, "y"), Overlapping, 1, 1},
		{"each with more of its own", fake(t, "a", true, 0.3, 0.03, 4000, "x", "y"), fake(t, "b", true, 0.35, 0.04, 4000, "y", "z"), Overlapping, 1, 1},
		{"widths alike", fake(t, "a", true, 0.3, 0.03, 4000, "x", "y"), fake(t, "b", true, 0.34, 0.0305, 4000, "y"), Nested, 1, math.NaN()},
		{"the same run", fake(t, "a", true, 0.3, 0.03, 4000, "x"), fake(t, "b", true, 0.3, 0.03, 4000, "x"), Nested, 1, math.NaN()},
	} {
		p := New([]*gather.Run{c.a, c.b}).Pairs[0]
		got := p.Shifts[0].Sigmas()
		if p.Rule != c.rule || p.Shared != c.shared || !(math.Abs(got-c.want) < 1e-9 || math.IsNaN(got) && math.IsNaN(c.want)) {
			t.Errorf("%s: rule %v, %d shared, %g; expected %v, %d, %g", c.name, p.Rule, p.Shared, got, c.rule, c.shared, c.want)
		}
	}
}

// space is that of a family with flat priors on the named parameters.
func space(t *testing.T, f likelihood.Family, names ...string) *likelihood.Space {
	t.Helper()
	for _, name := range names {
		prior, err := likelihood.Flat(0, 1)
		if err == nil && name == "w0" {
			prior, err = likelihood.Flat(-2, 0)
		}
		if err != nil {
			t.Fatal(err)
		}
		f.Free = append(f.Free, likelihood.Parameter{Name: name, Prior: prior})
	}
	s, err := likelihood.NewSpace(f)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// A run says what it has in place of a constraint: what it holds fixed, and at which
// value, what its data do not know, and nothing of what is not in it.
func TestInstead(t *testing.T) {
	curved, flat := fake(t, "curved", false, 0.3, 0.03, 4000, "x"), fake(t, "flat", true, 0.31, 0.03, 4000, "x")
	curved.Job.Space = space(t, likelihood.Family{DarkEnergy: likelihood.W}, "Om", "OL", "w0")
	for _, name := range []string{"OL", "Ok", "w0", "H0"} {
		curved.Summary.Parameters = append(curved.Summary.Parameters, result.Quantity{Name: name, Mean: 0.1, SD: 0.02, Median: 0.1,
			Interval68: [2]result.Number{0.08, 0.12}, Interval95: [2]result.Number{0.06, 0.14}, Constrained: true, CutByPrior: name == "w0"})
	}
	flat.Summary.Derived = []result.Quantity{{Name: "OL"}}
	c := New([]*gather.Run{curved, flat})
	for i, want := range []string{"", "not constrained", "0, fixed", "-1, fixed", ""} {
		if q := c.Quantities[i]; q.Instead[1] != want || q.Instead[0] != "" {
			t.Errorf("%s: %q, expected only the second run to say %q", q.Name, q.Instead, want)
		}
	}
	var text strings.Builder
	if err := c.Text(&text); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"Ok\n  curved  0.100 ± 0.020       0.080 … 0.120       0.060 … 0.140\n  flat    0, fixed\n", "\n  flat    -1, fixed\n"} {
		if !strings.Contains(text.String(), want) {
			t.Errorf("the text lacks %q:\n%s", want, text.String())
		}
	}
	for _, want := range []string{`$w_0$ & $0.100 \pm 0.020{}^{*}$ & $-1$, fixed \\`, `\multicolumn{3}{l}{\footnotesize $^{*}$ cut by its prior}\\`} {
		if tex := string(c.TeX()); !strings.Contains(tex, want) {
			t.Errorf("the table lacks %q:\n%s", want, tex)
		}
	}
	if got := c.having([2]string{"Om", "OL"}); !slices.Equal(got, []int{0, 1}) {
		t.Errorf("in the plane of Om and OL are runs %v, expected both, the flat one on its line", got)
	}
	if got := New([]*gather.Run{flat, flat}).having([2]string{"Om", "OL"}); got != nil {
		t.Errorf("flat runs alone have a plane of Om and OL: %v", got)
	}
}

func TestShortNames(t *testing.T) {
	for _, c := range [][2][]string{
		{{"runs/a", "runs/b"}, {"a", "b"}},
		{{"one/fate", "two/fate", "flat"}, {"one/fate", "two/fate", "flat"}},
	} {
		var runs []*gather.Run
		for _, dir := range c[0] {
			runs = append(runs, fake(t, dir, true, 0, 1, 100))
		}
		if got := shortNames(runs); !slices.Equal(got, c[1]) {
			t.Errorf("shortNames(%q) = %q, expected %q", c[0], got, c[1])
		}
	}
}

// A run that is not whole is named with what it lacks, and what a folder or a run
// file calls it cannot reach the terminal as a command.
func TestTextOfPartialRuns(t *testing.T) {
	whole, cut, open := fake(t, "a", true, 0.3, 0.03, 4000, "x"), fake(t, "b", true, 0.35, 0.04, 4000, "y"), fake(t, "c", true, 0.31, 0.03, 900, "z")
	whole.Summary.Title, cut.Summary.Title = "All of it\x1b[2J", ""
	cut.Cut = "chain.csv: used up to step 7; dropped the 12 bytes after it: line 3: found \x07, which is long enough for a second line"
	open.Summary.Complete = false
	open.Summary.Sampling = result.Sampling{MinESS: 912.7, Goal: 4000, MaxRHat: 1.02}
	var b strings.Builder
	if err := New([]*gather.Run{whole, cut, open}).Text(&b); err != nil {
		t.Fatal(err)
	}
	const want = `a  All of it�[2J
b
   chain.csv: used up to step 7; dropped the 12 bytes after it: line 3: found �,
   which is long enough for a second line
c
   unfinished: effective samples 912 (goal 4000), R-hat 1.0200; omen resume c
   goes on

`
	if head, _, _ := strings.Cut(b.String(), "  mean ± sd"); strings.TrimRight(head, " ") != strings.ReplaceAll(want, `\ufffd`, "\ufffd") {
		t.Errorf("got\n%s\nexpected\n%s", head, want)
	}
}

func ExampleSigmas() {
	fmt.Println(Sigmas(Shift{"Om", 0.02, 0.01}), Sigmas(Shift{"OL", -0.005, 0.01}), Sigmas(Shift{"q0", 0.1, math.NaN()}))
	// Output: +2.0 -0.5 –
}
