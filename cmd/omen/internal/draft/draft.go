// Package draft writes what a run has to say in the form that a paper takes it:
//
//	Constraints  constraints.tex: a tabular for \input, with the rules of booktabs
//	Fates        fates.tex: another, of the probability of each fate
//	Nested       nested.tex: and one of the nested universes
//	Numbers      numbers.tex: one macro for every number, so that a text updates itself
//	Methods      methods.md: two paragraphs on data, priors, likelihood and chain
//	CSV          constraints.csv: the same numbers for a program
//
// Numbers have the digits that they have on the terminal, none finer than its Monte
// Carlo error. Every name from a file is escaped.
package draft

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// estimate is a quantity as it is printed: mean and standard deviation, or median
// and the central 68% where the errors on the two sides differ.
type estimate struct {
	centre, up, down float64
	symmetric        bool
	place            int // of the last digit
}

// lopsided is how much the two errors must differ, relative to their mean, to be
// printed apart: less changes no second digit.
const lopsided = 0.1

func newEstimate(q result.Quantity) estimate {
	median, sd := float64(q.Median), float64(q.SD)
	up, down := float64(q.Interval68[1])-median, median-float64(q.Interval68[0])
	noise := math.Hypot(float64(q.MCSE68[0]), float64(q.MCSE68[1]))
	place := digits.Place(sd, float64(q.MCSE))
	if d := math.Abs(up - down); d > lopsided*(up+down)/2 && d > 2*noise && digits.Format(up, place) != digits.Format(down, place) {
		return estimate{centre: median, up: up, down: down, place: place}
	}
	return estimate{float64(q.Mean), sd, sd, true, place}
}

// tex is the estimate in math mode.
func (e estimate) tex() string {
	if e.symmetric {
		return number(e.centre, e.place) + ` \pm ` + digits.Width(e.up, e.place)
	}
	return number(e.centre, e.place) + "^{+" + digits.Width(e.up, e.place) + "}_{-" + digits.Width(e.down, e.place) + "}"
}

// number formats for math mode.
func number(x float64, place int) string {
	switch {
	case math.IsNaN(x):
		return `\text{--}`
	case math.IsInf(x, 0):
		return map[bool]string{true: `\infty`, false: `-\infty`}[x > 0]
	}
	return digits.Format(x, place)
}

// Constraints writes constraints.tex.
func Constraints(r *gather.Run) []byte {
	var b bytes.Buffer
	s := r.Summary
	all := slices.Concat(s.Parameters, s.Derived)
	heading(&b, r, "The constraints as a tabular. In the preamble: \\usepackage{booktabs}. In the text:",
		`  \begin{table}\centering\input{constraints}\caption{...}\end{table}`,
		"Mean and standard deviation, or median and central 68% interval where the errors",
		"differ; central 95% interval; best fit.")
	fmt.Fprintf(&b, "\\begin{tabular}{lccc}\n\\toprule\nQuantity & %s & Central 95\\%% & Best fit \\\\\n\\midrule\n", column(all))
	for _, q := range s.Parameters {
		best, ok := s.Fit.Best[q.Name]
		row(&b, q, best, ok)
	}
	if len(s.Derived) > 0 {
		b.WriteString("\\midrule\n")
	}
	for _, q := range s.Derived {
		row(&b, q, 0, false)
	}
	b.WriteString("\\bottomrule\n" + Notes(all, 4) + "\\end{tabular}\n")
	if !s.Complete {
		b.WriteString("\\par\\smallskip\\textbf{Unfinished: the run stopped before its goal.}\n")
	}
	return b.Bytes()
}

// column is the title of a column of estimates.
func column(qs []result.Quantity) string {
	if slices.ContainsFunc(qs, apart) {
		return "Value"
	}
	return `Mean $\pm$ sd`
}

// apart reports whether a quantity is printed with an error on either side.
func apart(q result.Quantity) bool { return q.Constrained && !newEstimate(q).symmetric }

// Notes says under a table of so many columns what its values and marks are, as far as
// they need it.
func Notes(qs []result.Quantity, columns int) string {
	note := func(text string) string {
		return fmt.Sprintf("\\multicolumn{%d}{l}{\\footnotesize %s}\\\\\n", columns, text)
	}
	s := ""
	if slices.ContainsFunc(qs, apart) {
		s += note(`Mean $\pm$ sd; with two errors, median and central 68\%`)
	}
	if slices.ContainsFunc(qs, func(q result.Quantity) bool { return q.CutByPrior && q.Constrained }) {
		s += note("$^{*}$ cut by its prior")
	}
	return s
}

// Name is a quantity with its unit.
func Name(name, inUnit string) string {
	s := "$" + symbol(name) + "$"
	if u := unit(inUnit); u != "" {
		s += " ($" + u + "$)"
	}
	return s
}

// Estimate is a quantity with its errors, marked where its prior cuts it.
func Estimate(q result.Quantity) string {
	s := newEstimate(q).tex()
	if q.CutByPrior {
		s += "{}^{*}"
	}
	return "$" + s + "$"
}

func row(b *bytes.Buffer, q result.Quantity, best result.Number, known bool) {
	name := Name(q.Name, q.Unit)
	if !q.Constrained {
		fmt.Fprintf(b, "%s & not constrained & & \\\\\n", name)
		return
	}
	at := ""
	if known {
		at = "$" + report.Best(q, best) + "$"
	}
	lo, hi := report.Ends(q.Interval95, q.MCSE95, q)
	fmt.Fprintf(b, "%s & %s & $[%s, %s]$ & %s \\\\\n", name, Estimate(q), inMath(lo), inMath(hi), at)
}

// probability is a probability in math mode, with its error or as a limit.
func probability(f result.Fate) string { return inMath(report.Probability(f)) }

// inMath sets a number of the screen in math mode.
func inMath(s string) string {
	s = gather.Scientific(strings.TrimSuffix(s, " (95%)"), func(times, exponent string) string {
		return strings.Replace(times, "×", ` \times `, 1) + "10^{" + strings.Replace(exponent, "−", "-", 1) + "}"
	})
	return strings.NewReplacer("±", `\pm`, "–", `\text{--}`, "not known", `\text{not known}`).Replace(s)
}

// event is the name of a fate or statement without its explanation.
func event(name string) string {
	name, _, _ = strings.Cut(name, " (")
	if name == "accelerating" {
		name += " today"
	}
	return name
}

// heading says in comments what a file is and where it comes from.
func heading(b *bytes.Buffer, r *gather.Run, lines ...string) {
	title := r.Summary.Title
	if title == "" {
		title = "a run"
	}
	fmt.Fprintf(b, "%% %s: written by omen %s; do not edit, it is written again.\n", comment(title), comment(r.Summary.Version))
	if !r.Summary.Complete {
		b.WriteString("% UNFINISHED: the run stopped before its goal.\n")
	}
	for _, l := range lines {
		fmt.Fprintf(b, "%% %s\n", l)
	}
}

// CSV writes constraints.csv: one row for each quantity, each number to the last
// place that its Monte Carlo error supports.
func CSV(r *gather.Run) ([]byte, error) {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	w.Write(Header())
	for _, qs := range [][]result.Quantity{r.Summary.Parameters, r.Summary.Derived} {
		for _, q := range qs {
			w.Write(Record(q, r.Summary.Fit.Best))
		}
	}
	w.Flush()
	return b.Bytes(), w.Error()
}

// Header names the columns of [Record].
func Header() []string {
	return []string{"name", "unit", "mean", "sd", "median", "lo68", "hi68", "lo95", "hi95", "hdi68_lo", "hdi68_hi",
		"best", "mcse", "ess", "rhat", "constrained"}
}

// Record is a quantity as a row of CSV, with the best fit where there is one.
func Record(q result.Quantity, best map[string]result.Number) []string {
	cell := func(x, mcse result.Number) string { return plainly(x, digits.Place(math.NaN(), float64(mcse))) }
	ends := func(v, mcse [2]result.Number) (lo, hi string) {
		place := digits.Ends(math.NaN(), [2]float64{float64(mcse[0]), float64(mcse[1])})
		return plainly(v[0], place), plainly(v[1], place)
	}
	at := ""
	if v, ok := best[q.Name]; ok {
		at = report.Best(q, v)
	}
	row := []string{q.Name, q.Unit, cell(q.Mean, q.MCSE), cell(q.SD, q.MCSE), cell(q.Median, q.MCSE)}
	for _, v := range [3][2][2]result.Number{{q.Interval68, q.MCSE68}, {q.Interval95, q.MCSE95}, {q.HDI68, q.MCSE68}} {
		lo, hi := ends(v[0], v[1])
		row = append(row, lo, hi)
	}
	return append(row, at, known(q.MCSE, digits.Error(float64(q.MCSE))), known(q.ESS, digits.Format(math.Floor(float64(q.ESS)), 0)),
		known(q.RHat, digits.Format(float64(q.RHat), -4)), strconv.FormatBool(q.Constrained))
}

// plainly is a number for a program, nothing where it does not exist.
func plainly(x result.Number, place int) string {
	if v := float64(x); math.IsNaN(v) || math.IsInf(v, 0) {
		return ""
	}
	return digits.Format(float64(x), place)
}

// known is a text, nothing where the number behind it is not known.
func known(x result.Number, text string) string {
	if math.IsNaN(float64(x)) {
		return ""
	}
	return text
}
