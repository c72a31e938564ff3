package report

import (
	"fmt"
	"math"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/result"
)

func fit(b *strings.Builder, s *result.Summary) {
	f := s.Fit
	Wrap(b, "", fmt.Sprintf("Best fit: chi² %.2f, %s, %s, probability %s",
		float64(f.Chi2), digits.Count(f.Rows, "row"), digits.Count(f.DoF, "degree of freedom"), chance(float64(f.Probability))))
	var best []string
	for _, q := range s.Parameters {
		best = append(best, q.Name+" "+Best(q, f.Best[q.Name]))
	}
	Wrap(b, "  ", "at "+strings.Join(best, ", "))
	if len(f.Tables) > 1 {
		for _, t := range f.Tables {
			fmt.Fprintf(b, "  %s chi² %8.2f for %s\n", pad(Printable(t.Name), 30), float64(t.Chi2), digits.Count(t.Rows, "row"))
		}
	}
	b.WriteString("\n")
}

// Best writes a quantity at the best fit with one digit more than its spread asks for: it
// comes from an optimiser and has no Monte Carlo error.
func Best(q result.Quantity, at result.Number) string {
	return digits.Format(float64(at), digits.Place(float64(q.SD), 0)-1)
}

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

// engine says how the posterior was explored, and whether two ways agree.
func engine(b *strings.Builder, s *result.Summary) {
	if m := s.Sampling; m.Steps > 0 {
		fmt.Fprintf(b, "Chain: %d ensembles of %d walkers, %s, the first %d burn-in\n", m.Ensembles, m.Walkers, digits.Count(m.Steps, "step"), m.BurnIn)
		fmt.Fprintf(b, "  effective samples %.0f at least (goal %d), R-hat %.4f at most\n", math.Floor(float64(m.MinESS)), m.Goal, float64(m.MaxRHat))
		fmt.Fprintf(b, "  acceptance %.2f, %d evaluations in %.1f s, seed %d\n", float64(m.Acceptance), m.Evaluations, m.Seconds, m.Seed)
		if m.DirectShare > 0 {
			fmt.Fprintf(b, "  %.2g of the sample needed all rows of its tables for chi²\n", float64(m.DirectShare))
		}
	}
	e := s.Engine
	if e.Name == "both" || e.Name == "quadrature" {
		fmt.Fprintf(b, "Quadrature: %d evaluations in %.1f s, ln evidence %.2f ± %.0g\n", e.Evaluations, e.Seconds, float64(e.LogEvidence), float64(e.Error))
	}
	if d := e.Largest; d != nil {
		Wrap(b, "  ", fmt.Sprintf("the chain differs by %.3f of the width at most (%s, %s)%s",
			float64(d.Widths), d.Quantity, d.Statistic, d.Allowance()))
	}
	if s.Sampling.Steps > 0 || e.Evaluations > 0 {
		b.WriteString("\n")
	}
}
