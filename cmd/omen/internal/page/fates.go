package page

import (
	"fmt"
	"html/template"
	"math"
	"slices"
	"strings"

	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// fateTables are the probabilities within the family, from the chain alone and
// averaged, under the run's prior and under others; same names the priors that
// are the run's own.
func fateTables(s *result.Summary) (out []shares, same string) {
	add := func(name, what string, own, averaged []result.Fate) {
		if len(own) > 0 {
			out = append(out, newShares(name, what, own, averaged))
		}
	}
	averaged := func(a *result.Averaged) result.Averaged {
		if a == nil {
			return result.Averaged{}
		}
		return *a
	}
	a := averaged(s.Averaged)
	add("What becomes of it", "Fate", s.Fates, a.Fates)
	add("What becomes of it if w stays at today's value", "Fate", s.FatesHeldW, a.FatesHeldW)
	add("Today", "Statement", s.Today, a.Today)
	var names []string
	for _, p := range s.Priors {
		if p.Same {
			names = append(names, p.Name)
			continue
		}
		a := averaged(p.Averaged)
		add("With a prior "+p.Name, "Fate", append(slices.Clone(p.Fates), p.Today...), append(slices.Clone(a.Fates), a.Today...))
	}
	return out, strings.Join(names, " or ")
}

func newShares(name, what string, own, averaged []result.Fate) shares {
	s := shares{Name: named(name), What: what, Columns: []string{"within the fitted family"}}
	counted := slices.ContainsFunc(own, func(f result.Fate) bool { return f.Chain != nil })
	if counted {
		s.Columns = append(s.Columns, "from the chain alone")
	}
	if len(averaged) > 0 {
		s.Columns = append(s.Columns, "averaged over nested universes")
	}
	for _, f := range append(slices.Clone(own), averaged...) {
		if slices.ContainsFunc(s.Rows, func(r share) bool { return r.Name == named(f.Name) }) {
			continue
		}
		in, here := find(own, f.Name)
		row := share{Name: named(f.Name), Percent: percent(in)}
		cell := func(text string) {
			row.Cells = append(row.Cells, shareCell{s.Columns[len(row.Cells)], probability(text)})
		}
		cell(nothing(in, here))
		if counted {
			cell(report.Counted(in))
		}
		if len(averaged) > 0 {
			cell(nothing(find(averaged, f.Name)))
		}
		s.Rows = append(s.Rows, row)
	}
	return s
}

func find(fates []result.Fate, name string) (result.Fate, bool) {
	i := slices.IndexFunc(fates, func(f result.Fate) bool { return f.Name == name })
	if i < 0 {
		return result.Fate{}, false
	}
	return fates[i], true
}

// nothing writes the probability of what may not be there.
func nothing(f result.Fate, here bool) string {
	if !here {
		return "0"
	}
	return report.Probability(f)
}

func percent(f result.Fate) string {
	p := float64(f.Probability)
	if math.IsNaN(p) {
		p = 0
	}
	return fmt.Sprintf("%.1f", 100*p)
}

// probability sets powers of ten.
func probability(s string) template.HTML {
	return template.HTML(gather.Scientific(strings.ReplaceAll(string(text(s)), "1 - ", "1 − "), func(times, exponent string) string {
		return times + "10<sup>" + exponent + "</sup>"
	}))
}

// nested are the universes that the family contains, if there are several.
func nested(models []result.Nested) []universeRow {
	if len(models) < 2 {
		return nil
	}
	aic, bic := math.Inf(1), math.Inf(1)
	for _, m := range models {
		if m.Ruled == "" {
			aic, bic = min(aic, float64(m.AIC)), min(bic, float64(m.BIC))
		}
	}
	var out []universeRow
	for _, m := range models {
		out = append(out, universeRow{Name: named(m.Words), Ruled: m.Ruled, Own: m.Own, Free: m.Parameters,
			Chi2: fmt.Sprintf("%.2f", float64(m.Chi2)), AIC: fmt.Sprintf("%.2f", float64(m.AIC)-aic), BIC: fmt.Sprintf("%.2f", float64(m.BIC)-bic),
			Bayes: text(report.Bayes(m)), Probability: probability(report.ModelProbability(m))})
	}
	return out
}

// times are when things happen.
func times(list []result.Time) []when {
	var out []when
	for _, t := range list {
		median, in68, in95 := report.When(t)
		w := when{Name: t.Words, Unit: t.Unit, Median: text(median), In68: text(in68), In95: text(in95)}
		if median == "" {
			w.Why = fmt.Sprintf("too few draws: %.0f in which %s", math.Max(0, float64(t.ESS)), t.Given)
		}
		out = append(out, w)
	}
	return out
}

// likeliest names the most probable of the nested universes in a sentence.
func likeliest(models []result.Nested) template.HTML {
	if len(models) < 2 {
		return ""
	}
	best := models[0]
	for _, m := range models {
		if m.Probability > best.Probability {
			best = m
		}
	}
	return template.HTML(fmt.Sprintf("Of the %d nested universes the most probable is: %s, with probability %s.",
		len(models), named(best.Words), probability(report.ModelProbability(best))))
}
