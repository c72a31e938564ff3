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
		fmt.Fprintf(&b, "%s\n\n", Printable(s.Title))
	}
	if !s.Complete {
		b.WriteString("UNFINISHED: this run stopped before its goal; see the warnings.\n\n")
	}
	quantities(&b, "Parameters", s.Parameters)
	quantities(&b, "Derived", s.Derived)
	averaged := s.Averaged
	if averaged == nil {
		averaged = &result.Averaged{}
	}
	fates(&b, "Fate", s.Fates, averaged.Fates)
	fates(&b, "Fate, if w stays as today", s.FatesHeldW, averaged.FatesHeldW)
	fates(&b, "Today", s.Today, averaged.Today)
	explain(&b, s)
	nested(&b, s.Nested)
	priors(&b, s)
	times(&b, s)
	if s.Fit.Rows > 0 {
		fit(&b, s)
	}
	engine(&b, s)
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
	last := "MC err"
	if math.IsNaN(float64(qs[0].ESS)) {
		last = ""
	}
	line(b, fmt.Sprintf("%-16s %-17s %-17s %-17s %s", title, "mean ± sd", "68% interval", "95% interval", last))
	for _, q := range qs {
		name := q.Name
		if q.Unit != "" {
			name += " [" + q.Unit + "]"
		}
		mcse := ""
		if last != "" {
			mcse = digits.Error(float64(q.MCSE))
		}
		line(b, fmt.Sprintf("  %s %s %s %s %s", pad(name, 14), pad(MeanSD(q), 17), pad(Interval(q.Interval68, q.MCSE68, q), 17),
			pad(Interval(q.Interval95, q.MCSE95, q), 17), mcse))
		if !q.Constrained {
			fmt.Fprintf(b, "  %14s not constrained by these data: as wide as its prior\n", "")
		}
	}
	b.WriteString("\n")
}

// line writes a line without blanks at its end.
func line(b *strings.Builder, text string) { b.WriteString(strings.TrimRight(text, " ") + "\n") }

// MeanSD writes mean and standard deviation of a quantity.
func MeanSD(q result.Quantity) string {
	return digits.Value(float64(q.Mean), float64(q.SD), float64(q.MCSE))
}

// Interval writes the ends of an interval, both with the digits that their Monte Carlo
// errors leave them.
func Interval(ends, mcse [2]result.Number, q result.Quantity) string {
	lo, hi := Ends(ends, mcse, q)
	return lo + " … " + hi
}

// Ends writes the ends of an interval one by one.
func Ends(ends, mcse [2]result.Number, q result.Quantity) (lo, hi string) {
	place := digits.Ends(float64(q.SD), [2]float64{float64(mcse[0]), float64(mcse[1])})
	return digits.Format(float64(ends[0]), place), digits.Format(float64(ends[1]), place)
}

// Wrap writes words in lines of at most 80 columns, the later ones indented.
func Wrap(b *strings.Builder, indent, text string) {
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

func list(b *strings.Builder, title string, items []string) {
	if len(items) == 0 {
		return
	}
	b.WriteString(title + "\n")
	for _, item := range items {
		Wrap(b, "  ", Printable(item))
	}
	b.WriteString("\n")
}
