package gather

import (
	"math"
	"regexp"
	"slices"
	"strings"

	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// FateSeries is one table of fates under a name.
type FateSeries struct {
	Name  string
	Fates []result.Fate
}

// Series lists the tables of fates of a run.
func (r *Run) Series() []FateSeries {
	s := r.Summary
	all := []FateSeries{{"within the fitted family", s.Fates}, {"if w stays at today's value", s.FatesHeldW}}
	if s.Averaged != nil {
		all = append(all, FateSeries{"averaged over the nested universes", s.Averaged.Fates})
	}
	return slices.DeleteFunc(all, func(f FateSeries) bool { return len(f.Fates) == 0 })
}

// fates is the bar chart of probabilities.
func (r *Run) fates() (*Picture, error) {
	series := r.Series()
	if len(series) == 0 {
		return absent("no fate was determined"), nil
	}
	in := figure.Fates{LimitLevel: figure.Plain(limitLevel(series)), Unfinished: r.Unfinished()}
	names := fateRows(series)
	for _, name := range names {
		in.Rows = append(in.Rows, figure.Plain(name))
	}
	for _, s := range series {
		bars := figure.FateSeries{Name: figure.Plain(s.Name)}
		for _, name := range names {
			bars.Values = append(bars.Values, bar(s.Fates, name))
		}
		in.Series = append(in.Series, bars)
	}
	var words []string
	for _, s := range series {
		var list []string
		for _, f := range s.Fates {
			list = append(list, f.Name+" "+report.Probability(f))
		}
		words = append(words, s.Name+": "+strings.Join(list, "; "))
	}
	caption := "The probability of each fate with its error. A dashed bar with an arrow is an upper limit; an open arrow stands for what is too small for a bar."
	if len(series) > 1 && r.Summary.Averaged != nil {
		caption += " The nested universes are weighted with their own probabilities; an exactly flat, critical or coasting one has none in the continuous posterior of the fitted family."
	}
	return &Picture{Caption: caption + r.extrapolation(), Alt: "Probabilities " + strings.Join(words, ". Probabilities ") + ".",
		draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawFates(in, w) }}, nil
}

// limitLevel is what upper limits are: of 95% where they follow from counts alone; the
// bound of an integral has no level.
func limitLevel(series []FateSeries) string {
	for _, s := range series {
		for _, f := range s.Fates {
			if f.Exact && f.Upper95 > 0 {
				return "upper limit"
			}
		}
	}
	return "95% upper limit"
}

// fateRows are the fates to show: those that have a probability large enough for a bar
// in one of the series, and what the fitted family could do.
func fateRows(series []FateSeries) []string {
	var names []string
	for i, s := range series {
		for _, f := range s.Fates {
			possible := i == 0 && (f.Probability > 0 || f.Upper95 > 0)
			if (possible || f.Probability > figure.Faintest) && !slices.Contains(names, f.Name) {
				names = append(names, f.Name)
			}
		}
	}
	return names
}

// bar is the probability of a fate in a series, printed as everywhere else.
func bar(fates []result.Fate, name string) figure.Probability {
	i := slices.IndexFunc(fates, func(f result.Fate) bool { return f.Name == name })
	if i < 0 { // it cannot be
		return figure.Probability{Text: figure.Plain("0")}
	}
	f := fates[i]
	text := figure.Markup(Scientific(strings.ReplaceAll(strings.TrimSuffix(report.Probability(f), " (95%)"), " - ", " − "), func(m, e string) string { return m + "10^{" + e + "}" }))
	p, up := float64(f.Probability), float64(f.Upper95)
	if p == 0 && up > 0 {
		return figure.Probability{P: up, Limit: true, Text: text}
	}
	out := figure.Probability{P: p, Text: text}
	if e := float64(f.Error); e > 0 && e > p/1000 && !math.IsInf(e, 1) {
		out.Err = e
	}
	return out
}

var exponent = regexp.MustCompile(`(\d+(?:\.\d+)?)e(-?)(\d+)`)

// Scientific replaces every number such as 6.3e-5 in a text by what set makes of
// "6.3×" (nothing for 1) and "−5".
func Scientific(s string, set func(times, exponent string) string) string {
	return exponent.ReplaceAllStringFunc(s, func(n string) string {
		m := exponent.FindStringSubmatch(n)
		times := m[1] + "×"
		if m[1] == "1" {
			times = ""
		}
		return set(times, strings.Replace(m[2], "-", "−", 1)+strings.TrimLeft(m[3], "0"))
	})
}
