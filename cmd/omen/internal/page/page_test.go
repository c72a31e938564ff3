package page

import (
	"bytes"
	"fmt"
	"strings"
	"testing"

	"omen/cmd/omen/internal/compare"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
)

func TestText(t *testing.T) {
	for _, c := range [][2]string{
		{"-0.51 ± 0.03", "−0.51\u00a0±\u00a00.03"},
		{"-0.54 … -0.48", "−0.54 … −0.48"},
		{"a-1 <b>", "a-1 &lt;b&gt;"},
	} {
		if got := string(text(c[0])); got != c[1] {
			t.Errorf("text(%q) = %q, expected %q", c[0], got, c[1])
		}
	}
	if got, want := string(probability("> 1 - 2.5e-9")), "&gt; 1 − 2.5×10<sup>−9</sup>"; got != want {
		t.Errorf("probability: %q, expected %q", got, want)
	}
}

// A quantity in the name of a universe or a statement has its symbol; a word that holds
// the letters of one has not.
func TestNamed(t *testing.T) {
	for in, want := range map[string]string{
		"closed (Ok < 0)": "closed (Ω<sub>k</sub>\u00a0&lt;\u00a00)", "critical (Om = 1)": "critical (Ω<sub>m</sub> = 1)",
		"flat in (Om, q0)": "flat in (Ω<sub>m</sub>, <i>q</i><sub>0</sub>)", "Omega, flat w0wa": "Omega, flat w0wa",
	} {
		if got := string(named(in)); got != want {
			t.Errorf("named(%q) = %q, expected %q", in, got, want)
		}
	}
}

// The shares of a page: what one column lacks is zero there, what no chain could
// count a dash.
func TestShares(t *testing.T) {
	chain := result.Fate{Name: "a", Probability: 0.25, Error: 0.01}
	s := newShares("Fates", "Fate", []result.Fate{{Name: "a", Probability: 0.2468, Exact: true, Chain: &chain}, {Name: "b", Probability: 0.7532, Exact: true}},
		[]result.Fate{{Name: "c", Probability: 0.9, Exact: true}})
	got := fmt.Sprint(s.Columns, s.Rows)
	const want = "[within the fitted family from the chain alone averaged over nested universes] " +
		"[{a 24.7 [{within the fitted family 0.2468} {from the chain alone 0.25\u00a0±\u00a00.01} {averaged over nested universes 0}]} " +
		"{b 75.3 [{within the fitted family 0.7532} {from the chain alone –} {averaged over nested universes 0}]} " +
		"{c 0.0 [{within the fitted family 0} {from the chain alone –} {averaged over nested universes 0.9000}]}]"
	if got != want {
		t.Errorf("shares:\n%s\nexpected\n%s", got, want)
	}
}

func ExampleComparison() {
	om, _ := likelihood.Flat(0, 1)
	space, err := likelihood.NewSpace(likelihood.Family{Flat: true, Free: []likelihood.Parameter{{Name: "Om", Prior: om}}})
	if err != nil {
		fmt.Println(err)
		return
	}
	var runs []*gather.Run
	for _, dir := range []string{"a<b", "c"} {
		runs = append(runs, &gather.Run{Run: &result.Run{Job: &job.Job{Space: space}}, Summary: &result.Summary{Complete: true}, Dir: dir})
	}
	var page bytes.Buffer
	if err := Comparison(&page, compare.New(runs), nil, "0.1.0"); err != nil {
		fmt.Println(err)
	}
	fmt.Println(strings.Contains(page.String(), "<h1>a&lt;b, c</h1>"))
	// Output: true
}
