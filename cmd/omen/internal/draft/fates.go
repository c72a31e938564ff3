package draft

import (
	"bytes"
	"fmt"
	"math"
	"slices"

	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// Fates writes fates.tex: the probability of each fate and of statements about the
// present, within the fitted family and averaged over the nested universes.
func Fates(r *gather.Run) []byte {
	var b bytes.Buffer
	s := r.Summary
	averaged := s.Averaged
	columns, title := "lc", "Fate & Probability"
	if averaged != nil {
		columns, title = "lcc", "Fate & Fitted family & Averaged"
	} else {
		averaged = &result.Averaged{}
	}
	heading(&b, r, "The probability of each fate as a tabular; see constraints.tex. Averaged: over the",
		"nested universes of nested.tex, each with its own probability. Limits are at 95%.")
	fmt.Fprintf(&b, "\\begin{tabular}{%s}\n\\toprule\n%s \\\\\n", columns, title)
	block := func(own, averaged []result.Fate, condition string) {
		if len(own) == 0 {
			return
		}
		b.WriteString("\\midrule\n")
		for _, name := range union(own, averaged) {
			fmt.Fprintf(&b, "%s%s & %s", Escape(event(name)), condition, cell(own, name))
			if s.Averaged != nil {
				b.WriteString(" & " + cell(averaged, name))
			}
			b.WriteString(" \\\\\n")
		}
	}
	block(s.Fates, averaged.Fates, "")
	block(s.FatesHeldW, averaged.FatesHeldW, " if $w$ stays")
	block(s.Today, averaged.Today, "")
	b.WriteString("\\bottomrule\n\\end{tabular}\n")
	return b.Bytes()
}

// union lists the names of a, then those that only b has.
func union(a, b []result.Fate) []string {
	var out []string
	for _, f := range append(slices.Clone(a), b...) {
		if !slices.Contains(out, f.Name) {
			out = append(out, f.Name)
		}
	}
	return out
}

func cell(fates []result.Fate, name string) string {
	i := slices.IndexFunc(fates, func(f result.Fate) bool { return f.Name == name })
	if i < 0 {
		return "0"
	}
	return "$" + probability(fates[i]) + "$"
}

// Nested writes nested.tex: the nested universes with what speaks for and against
// each. Nil if there are no two of them.
func Nested(r *gather.Run) []byte {
	models := r.Summary.Nested
	if len(models) < 2 {
		return nil
	}
	aic, bic := math.Inf(1), math.Inf(1)
	for _, m := range models {
		if m.Ruled == "" {
			aic, bic = min(aic, float64(m.AIC)), min(bic, float64(m.BIC))
		}
	}
	var b bytes.Buffer
	heading(&b, r, "The nested universes as a tabular; see constraints.tex. Free parameters with the",
		"marginalised offsets, chi-squared at the best fit, information criteria above the",
		"least, ln of the Bayes factor against the best, probability.")
	b.WriteString("\\begin{tabular}{lcccccc}\n\\toprule\nUniverse & Free & $\\chi^2$ & $\\Delta$AIC & $\\Delta$BIC & $\\ln B$ & Probability \\\\\n\\midrule\n")
	for _, m := range models {
		if m.Ruled != "" {
			fmt.Fprintf(&b, "%s & %d & \\multicolumn{5}{l}{cannot be: %s} \\\\\n", named(m.Words), m.Parameters, Escape(m.Ruled))
			continue
		}
		fmt.Fprintf(&b, "%s & %d & $%.2f$ & $%.2f$ & $%.2f$ & $%s$ & $%s$ \\\\\n", named(m.Words), m.Parameters, float64(m.Chi2),
			float64(m.AIC)-aic, float64(m.BIC)-bic, inMath(report.Bayes(m)), inMath(report.ModelProbability(m)))
	}
	b.WriteString("\\bottomrule\n\\end{tabular}\n")
	return b.Bytes()
}
