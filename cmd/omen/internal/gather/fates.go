package gather

import (
	"math"
	"slices"
	"strings"

	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// fates is the bar chart of probabilities.
func (r *Run) fates() (*Picture, error) {
	series := r.Series()
	in := figure.Fates{LimitLevel: figure.Plain("95% upper limit"), Unfinished: r.Unfinished()}
	var rows []string
	for _, s := range series {
		for _, f := range s.Fates {
			if !slices.Contains(rows, f.Name) {
				rows = append(rows, f.Name)
			}
		}
	}
	for _, name := range rows {
		in.Rows = append(in.Rows, figure.Plain(name))
	}
	for _, s := range series {
		bars := figure.FateSeries{Name: figure.Plain(s.Name)}
		for _, name := range rows {
			bars.Values = append(bars.Values, bar(s.Fates, name))
		}
		in.Series = append(in.Series, bars)
	}
	var words []string
	for _, f := range series[0].Fates {
		words = append(words, f.Name+" "+report.Probability(f))
	}
	return &Picture{Caption: "The probability of each fate with its Monte Carlo error. An open bar with an arrow is an upper limit: no draw of the posterior has that fate." + r.extrapolation(),
		Alt: "Probabilities: " + strings.Join(words, "; ") + ".", draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawFates(in, w) }}, nil
}

// FateSeries is one table of fates under a name.
type FateSeries struct {
	Name  string
	Fates []result.Fate
}

// Series lists the tables of fates of a run.
func (r *Run) Series() []FateSeries {
	out := []FateSeries{{"within the fitted family", r.Summary.Fates}}
	if len(r.Summary.FatesHeldW) > 0 {
		out = append(out, FateSeries{"if w stays at today's value", r.Summary.FatesHeldW})
	}
	return out
}

// bar is the probability of a fate in a series, printed as everywhere else.
func bar(fates []result.Fate, name string) figure.Probability {
	i := slices.IndexFunc(fates, func(f result.Fate) bool { return f.Name == name })
	if i < 0 {
		return figure.Probability{P: math.NaN()}
	}
	f := fates[i]
	text := figure.Plain(strings.TrimSuffix(report.Probability(f), " (95%)"))
	if f.Probability == 0 {
		return figure.Probability{P: float64(f.Upper95), Limit: true, Text: text}
	}
	p := figure.Probability{P: float64(f.Probability), Text: text}
	if e := float64(f.Error); e > 0 {
		p.Err = e
	}
	return p
}
