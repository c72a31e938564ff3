// Package report writes a result for people: as text for a terminal or a log.
package report

import (
	"fmt"
	"io"
	"math"
	"strings"
	"unicode/utf8"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/result"
)

// Text writes a result in at most 80 columns. No number has more digits than its
// Monte Carlo error supports.
func Text(w io.Writer, s *result.Summary) error {
	var b strings.Builder
	if s.Title != "" {
		fmt.Fprintf(&b, "%s\n\n", s.Title)
	}
	if !s.Complete {
		b.WriteString("UNFINISHED: this run stopped before its goal; see the warnings.\n\n")
	}
	quantities(&b, "Parameters", s.Parameters)
	quantities(&b, "Derived", s.Derived)
	fates(&b, "Fate", s.Fates)
	fates(&b, "Fate, if w stays at today's value", s.FatesHeldW)
	fates(&b, "Today", s.Today)
	fit(&b, s)
	sampling(&b, s)
	list(&b, "Assumed", s.Assumptions)
	list(&b, "Warnings", s.Warnings)
	_, err := io.WriteString(w, strings.TrimRight(b.String(), "\n")+"\n")
	return err
}

// quantities writes a block of constraints, one line each.
func quantities(b *strings.Builder, title string, qs []result.Quantity) {
	if len(qs) == 0 {
		return
	}
	fmt.Fprintf(b, "%-16s %-17s %-18s %-18s %s\n", title, "mean ± sd", "68% interval", "95% interval", "MC err")
	for _, q := range qs {
		name := q.Name
		if q.Unit != "" {
			name += " [" + q.Unit + "]"
		}
		fmt.Fprintf(b, "  %s %s %s %s %s\n", pad(name, 14), pad(MeanSD(q), 17), pad(Interval(q.Interval68, q.MCSE68, q), 18),
			pad(Interval(q.Interval95, q.MCSE95, q), 18), digits.Error(float64(q.MCSE)))
		if !q.Constrained {
			fmt.Fprintf(b, "  %14s not constrained by these data: as wide as its prior\n", "")
		}
	}
	b.WriteString("\n")
}

// MeanSD writes mean and standard deviation of a quantity.
func MeanSD(q result.Quantity) string {
	return digits.Value(float64(q.Mean), float64(q.SD), float64(q.MCSE))
}

// Interval writes the ends of an interval, each with the digits that its own
// Monte Carlo error leaves it.
func Interval(ends, mcse [2]result.Number, q result.Quantity) string {
	end := func(i int) string {
		return digits.Format(float64(ends[i]), digits.Place(float64(q.SD), float64(mcse[i])))
	}
	return end(0) + " … " + end(1)
}

// fates writes a block of probabilities.
func fates(b *strings.Builder, title string, fs []result.Fate) {
	if len(fs) == 0 {
		return
	}
	fmt.Fprintf(b, "%-38s probability\n", title)
	for _, f := range fs {
		fmt.Fprintf(b, "  %s %s\n", pad(f.Name, 35), Probability(f))
	}
	b.WriteString("\n")
}

// Probability writes a probability with its Monte Carlo error, or the limit that
// a count of none (or of all) leaves.
func Probability(f result.Fate) string {
	p, e, up := float64(f.Probability), float64(f.Error), float64(f.Upper95)
	switch {
	case p == 0:
		return "< " + digits.Error(up) + " (95%)"
	case p == 1:
		return "> " + digits.Format(1-up, limitPlace(up)) + " (95%)"
	}
	return digits.Share(p, e)
}

func limitPlace(up float64) int {
	p, ok := digits.Spread(up)
	if !ok {
		return -3
	}
	return p
}

func fit(b *strings.Builder, s *result.Summary) {
	f := s.Fit
	fmt.Fprintf(b, "Best fit: chi² %.2f for %d rows, %d degrees of freedom (probability %s)\n",
		float64(f.Chi2), f.Rows, f.DoF, chance(float64(f.Probability)))
	var best []string
	for _, q := range s.Parameters {
		best = append(best, fmt.Sprintf("%s %s", q.Name, digits.Format(float64(f.Best[q.Name]), fine(q))))
	}
	wrap(b, "  ", "at "+strings.Join(best, ", "))
	if len(f.Tables) > 1 {
		for _, t := range f.Tables {
			fmt.Fprintf(b, "  %s chi² %8.2f for %d rows\n", pad(t.Name, 30), float64(t.Chi2), t.Rows)
		}
	}
	b.WriteString("\n")
}

// fine is one digit more than the spread asks for: a best fit comes from an
// optimiser and has no Monte Carlo error.
func fine(q result.Quantity) int { return digits.Place(float64(q.SD), 0) - 2 }

func chance(p float64) string {
	switch {
	case math.IsNaN(p):
		return "unknown"
	case p < 0.0005:
		return "< 0.001"
	case p > 0.9995:
		return "> 0.999"
	}
	return fmt.Sprintf("%.3f", p)
}

func sampling(b *strings.Builder, s *result.Summary) {
	m := s.Sampling
	fmt.Fprintf(b, "Chain: %d ensembles of %d walkers, %d steps, the first %d burn-in\n", m.Ensembles, m.Walkers, m.Steps, m.BurnIn)
	fmt.Fprintf(b, "  effective samples %.0f at least (goal %d), R-hat %.4f at most\n", math.Floor(float64(m.MinESS)), m.Goal, float64(m.MaxRHat))
	fmt.Fprintf(b, "  acceptance %.2f, %d evaluations in %.1f s, seed %d\n\n", float64(m.Acceptance), m.Evaluations, m.Seconds, m.Seed)
}

func list(b *strings.Builder, title string, items []string) {
	if len(items) == 0 {
		return
	}
	b.WriteString(title + "\n")
	for _, item := range items {
		wrap(b, "  ", item)
	}
	b.WriteString("\n")
}

// wrap writes words in lines of at most 80 columns, the later ones indented.
func wrap(b *strings.Builder, indent, text string) {
	line := indent
	for i, word := range strings.Fields(text) {
		switch {
		case i == 0:
			line += word
		case utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > 80:
			b.WriteString(line + "\n")
			line = indent + "  " + word
		default:
			line += " " + word
		}
	}
	b.WriteString(line + "\n")
}

// pad fills a cell to a width counted in characters.
func pad(s string, width int) string {
	return s + strings.Repeat(" ", max(width-utf8.RuneCountInString(s), 0))
}
