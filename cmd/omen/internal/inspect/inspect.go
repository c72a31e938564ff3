// Package inspect says what was read for a run and what looks odd in it, so that
// a mistake in a table is found before it becomes a result.
package inspect

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"unicode/utf8"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/report"
	"omen/likelihood"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
)

// shown is how many rows a list of them holds at most.
const shown = 5

// Write reports every table of a job and the largest residuals from the best
// fit, whose parameters are best.
func Write(w io.Writer, j *job.Job, best []float64) error {
	var b strings.Builder
	e := j.Posterior.Evaluator()
	each, ok := e.Predictions(best)
	for i := range j.Tables {
		t := &j.Tables[i]
		head(&b, t)
		redshifts(&b, t)
		repeated(&b, t)
		errorRange(&b, t)
		covariance(&b, t)
		if ok {
			residuals(&b, t, &each[i])
		}
		b.WriteString("\n")
	}
	fmt.Fprintf(&b, "Best fit: chi² %.2f for %s, %s, at\n ", e.Chi2(best),
		digits.Count(j.Posterior.Rows(), "row"), digits.Count(j.Posterior.DegreesOfFreedom(), "degree of freedom"))
	for i, p := range j.Space.Free() {
		fmt.Fprintf(&b, " %s %.5g", p.Name, best[i])
	}
	b.WriteString("\n")
	_, err := io.WriteString(w, b.String())
	return err
}

// line writes a labelled line, aligned and broken before column 80.
func line(b *strings.Builder, label, format string, args ...any) {
	out := "  " + pad(label, 14)
	for _, word := range strings.Fields(report.Printable(fmt.Sprintf(format, args...))) {
		if utf8.RuneCountInString(out)+1+utf8.RuneCountInString(word) > 80 {
			b.WriteString(out + "\n")
			out = strings.Repeat(" ", 16)
		}
		out += " " + word
	}
	b.WriteString(out + "\n")
}

func head(b *strings.Builder, t *job.Table) {
	fmt.Fprintf(b, "%s (%s)\n", report.Printable(t.Name), t.Spec.Kind)
	line(b, "file", "%s", t.Spec.Table)
	s := t.Selection()
	line(b, "rows", "%d kept of %d", len(s.Kept), s.Read)
	for _, c := range s.Cuts {
		line(b, "", "%d removed by %s", c.Removed, c.Expression)
	}
	for _, w := range s.Warnings {
		line(b, "look at", "%v", w)
	}
	if f := t.Spec.StandsFor; f != nil {
		line(b, "stands for", "%s, chi² %.6g more", digits.Count(f.Rows, "measurement"), f.Chi2)
	}
}

// redshifts gives the range, and for supernovae how z and z_hel differ.
func redshifts(b *strings.Builder, t *job.Table) {
	z := t.Z()
	line(b, "redshift", "%.5g … %.5g", floats.Min(z), floats.Max(z))
	if t.Supernovae == nil {
		return
	}
	hel := t.Supernovae.ZHel
	if hel == nil {
		line(b, "z_hel", "not given: z stands in for it in (1+z_hel) D_M")
		return
	}
	same, worst := 0, 0.0
	for i := range z {
		if z[i] == hel[i] {
			same++
		}
		worst = math.Max(worst, math.Abs(z[i]-hel[i]))
	}
	line(b, "z − z_hel", "at most %.5f, equal in %s", worst, digits.Count(same, "row"))
	switch {
	case same == len(z):
		line(b, "look at", "z and z_hel agree in every row: was one copied into the other?")
	case worst > 0.005:
		line(b, "look at", "a change of frame is about 0.002 at most at low redshift (the Sun's 370 km/s and a few hundred of peculiar velocity); are the columns the right ones?")
	}
}

func repeated(b *strings.Builder, t *job.Table) {
	again := t.Selection().Repeated()
	if len(again) == 0 {
		return
	}
	rows := 0
	var names []string
	for _, r := range again {
		rows += len(r.Lines)
		names = append(names, fmt.Sprintf("%s (%d)", r.Name, len(r.Lines)))
	}
	line(b, "repeated", "%s in %s: %s", digits.Count(len(again), "name"), digits.Count(rows, "row"), few(names))
}

// few lists the first of some names.
func few(names []string) string {
	if len(names) > shown {
		names = append(slices.Clone(names[:shown]), "…")
	}
	return strings.Join(names, ", ")
}

func errorRange(b *strings.Builder, t *job.Table) {
	errs := t.Errors()
	if errs == nil {
		line(b, "errors", "none in the table")
		return
	}
	lo, mid, hi := spread(errs)
	line(b, "errors", "%.4g … %.4g, median %.4g", lo, hi, mid)
}

func spread(x []float64) (lo, median, hi float64) {
	s := slices.Sorted(slices.Values(x))
	return s[0], stat.Quantile(0.5, stat.Empirical, s, nil), s[len(s)-1]
}

// covariance gives size, symmetry, conditioning, and how the table's own errors
// compare with the diagonal.
func covariance(b *strings.Builder, t *job.Table) {
	switch {
	case len(t.Systematics) > 0:
		line(b, "templates", "%d in %s: %s", len(t.Systematics), t.Spec.Templates, few(t.Systematics))
		line(b, "covariance", "the errors squared, and the templates times their transpose")
		return
	case t.Covariance == nil:
		line(b, "covariance", "none: rows are taken as independent")
		return
	}
	n := t.Covariance.SymmetricDim()
	line(b, "covariance", "%d × %d in the file, %d × %d kept; holds: %s", t.Matrix.N(), t.Matrix.N(), n, n, holds(t.Spec.CovarianceHolds))
	line(b, "", "largest asymmetry %.1g of the errors of its rows", t.Matrix.Asymmetry)
	var eigen mat.EigenSym
	if eigen.Factorize(t.Covariance, false) {
		v := eigen.Values(nil)
		line(b, "", "smallest eigenvalue %.3g, condition number %.3g", v[0], v[n-1]/v[0])
	}
	errs := t.Errors()
	if errs == nil {
		return
	}
	ratio := make([]float64, n)
	for i := range ratio {
		ratio[i] = errs[i] / math.Sqrt(t.Covariance.At(i, i))
	}
	lo, mid, hi := spread(ratio)
	line(b, "", "table's error / √diagonal: %.3f … %.3f, median %.3f", lo, hi, mid)
	if note := ratioNote(t.Spec.CovarianceHolds, lo, mid, hi); note != "" {
		line(b, "look at", "%s", note)
	}
}

func holds(s string) string {
	switch s {
	case "added":
		return "what is added to the squared errors"
	case "inverse":
		return "the inverse covariance"
	}
	return "the total covariance"
}

// ratioNote explains a table's errors that do not match the diagonal. Users of
// public releases meet exactly this.
func ratioNote(holds string, lo, mid, hi float64) string {
	switch {
	case holds == "added" && mid > 0.99:
		return "the added covariance changes the errors by less than 1%: was the total meant?"
	case holds == "added":
		return ""
	case lo > 0.98 && hi < 1.02:
		return ""
	case mid > 1.02:
		return "the table's errors are larger than the covariance allows: perhaps it is the systematic part alone, to be added (covariance-holds = \"added\")"
	}
	return "the table's errors differ from the covariance's: the fit uses the covariance alone, the errors are for plots"
}

// residuals lists the rows that fit worst.
func residuals(b *strings.Builder, t *job.Table, p *likelihood.Prediction) {
	term, ok := t.Term.(interface {
		Residuals(*likelihood.Prediction) []likelihood.Residual
	})
	if !ok {
		return
	}
	all := term.Residuals(p)
	order := make([]int, len(all))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int {
		if math.Abs(all[i].Sigmas) > math.Abs(all[j].Sigmas) {
			return -1
		}
		return 1
	})
	beyond := 0
	for _, r := range all {
		if math.Abs(r.Sigmas) > 3 {
			beyond++
		}
	}
	line(b, "residuals", "%d of %d beyond 3 errors (%.1f expected); the largest:", beyond, len(all), 0.0027*float64(len(all)))
	fmt.Fprintf(b, "    %-24s %8s %9s %10s %10s %7s\n", "", "line", "z", "measured", "best fit", "errors")
	for _, i := range order[:min(shown, len(order))] {
		r := all[i]
		fmt.Fprintf(b, "    %s %8d %9.5g %10.4f %10.4f %+7.1f\n", pad(label(t, i), 24), t.Selection().Lines[i], r.Z, r.Measured, r.Predicted, r.Sigmas)
	}
}

// label names a row as far as its table does.
func label(t *job.Table, i int) string {
	name := ""
	switch {
	case t.Supernovae != nil && t.Supernovae.Name != nil:
		name = t.Supernovae.Name[i]
	case t.BAO != nil:
		name = t.BAO.Quantity[i].String()
	case t.Ages != nil && t.Ages.Name != nil:
		name = t.Ages.Name[i]
	}
	name = report.Printable(name)
	if r := []rune(name); len(r) > 24 {
		name = string(r[:23]) + "…"
	}
	return name
}

// pad fills a cell to a width counted in characters.
func pad(s string, width int) string {
	return s + strings.Repeat(" ", max(width-utf8.RuneCountInString(s), 0))
}
