package compare

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"strings"
	"unicode/utf8"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/draft"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// Text writes the comparison for a terminal, at most 80 columns wide.
func (c *Comparison) Text(w io.Writer) error {
	var b strings.Builder
	width := 0
	for _, r := range c.Runs {
		width = max(width, min(utf8.RuneCountInString(r.Name), 30))
	}
	for _, r := range c.Runs {
		line := pad(shorten(r.Name, width), width) + "  " + shorten(r.Summary.Title, 78-width)
		b.WriteString(strings.TrimRight(line, " ") + "\n")
		for _, text := range r.Amiss() {
			wrap(&b, strings.Repeat(" ", width+2), text)
		}
	}
	fmt.Fprintf(&b, "\n%-*s  %-19s %-19s %s\n", width+2, "", "mean ± sd", "68% interval", "95% interval")
	for _, q := range c.Quantities {
		name := q.Name
		if q.Unit != "" {
			name += " [" + q.Unit + "]"
		}
		b.WriteString(name + "\n")
		for i, v := range q.Values {
			name := pad(shorten(c.Runs[i].Name, width), width)
			switch {
			case v != nil:
				fmt.Fprintf(&b, "  %s  %s %s %s\n", name, pad(report.MeanSD(*v), 19),
					pad(report.Interval(v.Interval68, v.MCSE68, *v), 19), report.Interval(v.Interval95, v.MCSE95, *v))
			case q.Instead[i] != "":
				fmt.Fprintf(&b, "  %s  %s\n", name, q.Instead[i])
			}
		}
	}
	b.WriteString("\nShift from the first to the second, in units of its expected scatter\n")
	for _, p := range c.Pairs {
		c.pairText(&b, p)
	}
	_, err := io.WriteString(w, b.String())
	return err
}

// wrap writes words after an indent, in lines of at most 80 columns where they fit.
func wrap(b *strings.Builder, indent, text string) {
	line := indent
	for _, word := range strings.Fields(report.Printable(text)) {
		if len(line) > len(indent) && utf8.RuneCountInString(line+word) > 80 {
			b.WriteString(strings.TrimRight(line, " ") + "\n")
			line = indent
		}
		line += word + " "
	}
	b.WriteString(strings.TrimRight(line, " ") + "\n")
}

func (c *Comparison) pairText(b *strings.Builder, p Pair) {
	fmt.Fprintf(b, "  %s to %s\n", shorten(c.Runs[p.A].Name, 34), shorten(c.Runs[p.B].Name, 34))
	fmt.Fprintf(b, "    %s\n    scatter %s\n", p.Why(), p.Rule.Formula())
	line := "   "
	for _, s := range p.Shifts {
		item := fmt.Sprintf(" %s %s", s.Name, Sigmas(s))
		if utf8.RuneCountInString(line+item) > 79 {
			b.WriteString(line + "\n")
			line = "   "
		}
		line += item + " "
	}
	if len(p.Shifts) == 0 {
		line += " no quantity in common"
	}
	b.WriteString(strings.TrimRight(line, " ") + "\n")
	if p.alike() {
		b.WriteString("    – the two widths are too alike for their difference to be known\n")
	}
}

// alike reports whether a scatter is not known.
func (p Pair) alike() bool {
	for _, s := range p.Shifts {
		if math.IsNaN(s.Scatter) {
			return true
		}
	}
	return false
}

// Sigmas writes a shift, with its sign.
func Sigmas(s Shift) string {
	v := s.Sigmas()
	if math.IsNaN(v) {
		return "–"
	}
	text := digits.Format(v, -1)
	if v > 0 && text != "0.0" {
		text = "+" + text
	}
	return text
}

func pad(s string, n int) string { return s + strings.Repeat(" ", max(0, n-utf8.RuneCountInString(s))) }

// shorten makes a text fit for n columns of a terminal.
func shorten(s string, n int) string {
	s = report.Printable(s)
	if r := []rune(s); len(r) > n {
		return string(r[:max(n-1, 0)]) + "…"
	}
	return s
}

// CSV writes one row for each run and quantity.
func (c *Comparison) CSV() ([]byte, error) {
	rows := [][]string{append([]string{"run"}, draft.Header()...)}
	for _, q := range c.Quantities {
		for i, v := range q.Values {
			if v != nil {
				rows = append(rows, append([]string{c.Runs[i].Name}, draft.Record(*v, c.Runs[i].Summary.Fit.Best)...))
			}
		}
	}
	return table(rows)
}

// ShiftsCSV writes one row for each pair and quantity.
func (c *Comparison) ShiftsCSV() ([]byte, error) {
	rows := [][]string{{"from", "to", "name", "difference", "scatter", "sigmas", "rule", "shared_inputs"}}
	for _, p := range c.Pairs {
		for _, s := range p.Shifts {
			rule := [...]string{"independent", "nested", "overlapping"}[p.Rule]
			row := []string{c.Runs[p.A].Name, c.Runs[p.B].Name, s.Name, "", "", "", rule, fmt.Sprint(p.Shared)}
			place := digits.Place(s.Scatter, 0) - 1
			if math.IsNaN(s.Scatter) {
				place = digits.Place(s.Difference, 0)
			} else {
				row[4], row[5] = digits.Format(s.Scatter, place), digits.Format(s.Sigmas(), -2)
			}
			row[3] = digits.Format(s.Difference, place)
			rows = append(rows, row)
		}
	}
	return table(rows)
}

func table(rows [][]string) ([]byte, error) {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	err := w.WriteAll(rows)
	return b.Bytes(), err
}

// TeX writes a tabular with a row for each quantity and a column for each run.
func (c *Comparison) TeX() []byte {
	var b bytes.Buffer
	b.WriteString("% Constraints of several runs, written by omen; \\usepackage{booktabs}.\n")
	b.WriteString("% Mean and standard deviation, or median and central 68% interval where the errors differ.\n")
	fmt.Fprintf(&b, "\\begin{tabular}{l%s}\n\\toprule\nQuantity", strings.Repeat("c", len(c.Runs)))
	for _, r := range c.Runs {
		name := draft.Escape(r.Name)
		if r.Unfinished() {
			name += " (unfinished)"
		}
		b.WriteString(" & " + name)
	}
	b.WriteString(" \\\\\n\\midrule\n")
	var all []result.Quantity
	for _, q := range c.Quantities {
		b.WriteString(draft.Name(q.Name, q.Unit))
		for i, v := range q.Values {
			b.WriteString(" & ")
			if v != nil {
				b.WriteString(draft.Estimate(*v))
				all = append(all, *v)
			} else if at, ok := strings.CutSuffix(q.Instead[i], ", fixed"); ok {
				b.WriteString("$" + at + "$, fixed")
			} else {
				b.WriteString(q.Instead[i])
			}
		}
		b.WriteString(" \\\\\n")
	}
	b.WriteString("\\bottomrule\n" + draft.Notes(all, len(c.Runs)+1) + "\\end{tabular}\n")
	return b.Bytes()
}
