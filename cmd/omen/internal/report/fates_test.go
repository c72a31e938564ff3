package report

import (
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"omen/cmd/omen/internal/outlook"
	"omen/cmd/omen/internal/result"

	"github.com/google/go-cmp/cmp"
)

var none = result.Number(math.NaN())

// A probability in print: a count's limit and error, an integral's digits, however small.
func TestProbability(t *testing.T) {
	for _, c := range []struct {
		p, e, up result.Number
		exact    bool
		want     string
	}{
		{0, none, 0.00063, false, "< 0.00063 (95%)"},
		{0.3, result.Number(math.Inf(1)), none, false, "not known"},
		{0, none, 1, false, "< 1.0 (95%)"},
		{1, none, 1, false, "> 0 (95%)"},
		{1, none, 0.00063, false, "> 0.9994 (95%)"},
		{1, none, 0.96, false, "> 0.04 (95%)"},
		{1, none, 0.28, false, "> 0.72 (95%)"},
		{0, none, 1e-12, true, "< 1e-12"},
		{0, none, 8.9e-14, true, "< 1e-12"},
		{1, none, 2e-12, true, "> 1 - 2e-12"},
		{0, 0, none, true, "0"},
		{1, 0, none, true, "1"},
		{0.086, 0.0023, none, false, "0.086 ± 0.002"},
		{0.0891048, 1e-6, none, true, "0.0891"},
		{1.146e-8, 1e-12, none, true, "1.1e-8"},
		{1 - 1.146e-8, 1e-12, none, true, "1 - 1.1e-8"},
		{6.6e-69, 1e-74, none, true, "< 1e-12"},
		{0.000234, 1e-8, none, true, "0.00023"},
		{0.0003, 0.0001, none, false, "0.0003 ± 0.0001"},
	} {
		f := result.Fate{Probability: c.p, Error: c.e, Upper95: c.up, Exact: c.exact}
		if got := Probability(f); got != c.want {
			t.Errorf("%v ± %v, limit %v: %q, want %q", c.p, c.e, c.up, got, c.want)
		}
	}
}

// The table has a column for what there is, and a row for what only nested universes do.
func TestFatesTable(t *testing.T) {
	own := []result.Fate{{Name: "big rip", Probability: 0.25, Error: 1e-6, Upper95: none, Exact: true,
		Chain: &result.Fate{Probability: 0.247, Error: 0.0041, Upper95: none}}}
	averaged := []result.Fate{{Name: "big rip", Probability: 0.5, Error: 1e-6, Upper95: none, Exact: true},
		{Name: "critical", Probability: 0.5, Error: 1e-6, Upper95: none, Exact: true}}
	var b strings.Builder
	fates(&b, "Fate", own, averaged)
	want := `Fate                             probability      from the chain   over nested
  big rip                        0.2500           0.247 ± 0.004    0.5000
  critical                       0                –                0.5000

`
	if diff := cmp.Diff(want, b.String()); diff != "" {
		t.Error(diff)
	}
}

// What the averages are over is said once below the tables, with the odds that were taken;
// a plain 0 is explained where there is one.
func TestExplain(t *testing.T) {
	flat, curved := result.Nested{Words: "flat, Λ", Odds: 1}, result.Nested{Words: "curved, Λ", Own: true, Odds: 1}
	half := curved
	half.Odds = 0.5
	rip, critical := result.Fate{Name: "big rip"}, result.Fate{Name: "critical"}
	for _, c := range []struct {
		nested   []result.Nested
		averaged *result.Averaged
		want     string
	}{
		{nil, nil, ""},
		{[]result.Nested{flat, curved}, &result.Averaged{Fates: []result.Fate{rip}},
			"  over nested: averaged over the nested universes below, at equal prior odds\n\n"},
		{[]result.Nested{flat, half}, &result.Averaged{Fates: []result.Fate{rip, critical}},
			"  over nested: averaged over the nested universes below, at prior odds of 1 for\n    flat, Λ, 0.5 for curved, Λ\n" +
				"  0: such universes have no volume in this run's family\n\n"},
	} {
		var b strings.Builder
		explain(&b, &result.Summary{Fates: []result.Fate{rip}, Averaged: c.averaged, Nested: c.nested})
		if diff := cmp.Diff(c.want, b.String()); diff != "" {
			t.Error(diff)
		}
	}
}

// The nested table: what is ruled out says why, what has no odds says so.
func TestNestedTable(t *testing.T) {
	var b strings.Builder
	nested(&b, []result.Nested{
		{Words: "empty (coasting)", Parameters: 1, Ruled: "it makes no prediction for these data", Odds: 1},
		{Words: "flat, Λ", Parameters: 2, Chi2: 10.539, AIC: 14.539, BIC: 15.669, Probability: 0.95, Odds: 1},
		{Words: "curved, Λ", Own: true, Parameters: 3, Chi2: 10.23, AIC: 16.23, BIC: 17.925, LogBayesFactor: -2.9496, BayesError: 0.031, Probability: 0, Odds: 0},
	})
	want := `Nested universes     free     chi²     ΔAIC     ΔBIC       ln Bayes  probability
  empty (coasting)      1  cannot be: it makes no prediction for these data
  flat, Λ               2    10.54     0.00     0.00              0  0.9500
  curved, Λ *           3    10.23     1.69     2.26   -2.95 ± 0.03  – (odds 0)
  * this run's family; ln Bayes is against the best

`
	if diff := cmp.Diff(want, b.String()); diff != "" {
		t.Error(diff)
	}
}

// Probabilities of nested universes keep their digits, however small they are, and give up
// their error where a line would pass 80 columns. On the page and in LaTeX it stands.
func TestNestedProbability(t *testing.T) {
	for _, c := range []struct {
		p, e          result.Number
		want, inTable string
	}{
		{6.6e-69, 1e-72, "< 1e-12", "< 1e-12"},
		{0.91056, 1e-6, "0.9106", "0.9106"},
		{0.0654, 0.0002, "0.0654 ± 0.0002", "0.0654"},
		{0.5, 0.2, "0.5 ± 0.2", "0.5 ± 0.2"},
		{1 - 1.1e-8, 1e-11, "1 - 1.1e-8", "1 - 1.1e-8"},
	} {
		m := result.Nested{Words: "flat, w0-wa", Own: true, Parameters: 4, Odds: 1, Probability: c.p, ProbabilityErr: c.e, Chi2: 91416.45, AIC: 91424.45,
			BIC: 91434.45, LogBayesFactor: -1.393, BayesError: 0.012}
		var b strings.Builder
		nested(&b, []result.Nested{m, m})
		line := strings.Split(b.String(), "\n")[1]
		if ModelProbability(m) != c.want || !strings.HasSuffix(line, "  "+c.inTable) || utf8.RuneCountInString(line) > 80 {
			t.Errorf("%v ± %v: %q, in the table\n%s\nexpected %q and %q", c.p, c.e, ModelProbability(m), line, c.want, c.inTable)
		}
	}
}

func TestTimesTable(t *testing.T) {
	var b strings.Builder
	times(&b, &result.Summary{Times: []result.Time{
		{Words: "age today", Unit: "Gyr", Median: 13.512, Interval68: [2]result.Number{13.3, 13.7}, Interval95: [2]result.Number{13.1, 13.9}, MCSE: none, ESS: none},
		{Words: "time to the big crunch", Unit: "1/H0", Given: "it recollapses", Median: none, ESS: 7.2},
	}})
	want := `Times                                  median   68% interval    95% interval
  age today [Gyr]                      13.51    13.30 … 13.70   13.10 … 13.90
  time to the big crunch [1/H0]        –  too few draws of such: 7
  each in those universes alone in which it comes to be

`
	if diff := cmp.Diff(want, b.String()); diff != "" {
		t.Error(diff)
	}
}

func TestHistoryFile(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	got := string(History(&outlook.Trace{Gyr: true, Time: []float64{-14, 0, 80}, Best: []float64{nan, 1, nan}, Median: []float64{0, 1, inf},
		Low68: []float64{0, 1, 4}, High68: []float64{0, 1, inf}, Low95: []float64{0, 1, 3.5}, High95: []float64{0.01, 1, inf}}))
	want := `# scale factor of the universe, 1 today; time from today in Gyr
# best fit and posterior bands: not begun or over counts as 0, torn apart as inf
time,a_best,a_median,a_low68,a_high68,a_low95,a_high95
-14,,0,0,0,0,0.01
0,1,1,1,1,1,1
80,,inf,4,inf,3.5,inf
`
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
}
