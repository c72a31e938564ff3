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
