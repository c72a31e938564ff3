package quadrature_test

import (
	"context"
	"fmt"
	"math"

	"omen/sampler/quadrature"
)

// Two parameters known to ±0.05 each, with a positive correlation; what is the probability that they sum to
// more than 1.3, and what is their difference?
func Example() {
	const sigma, rho = 0.05, 0.6
	density := func(x []float64) float64 {
		a, b := (x[0]-0.3)/sigma, (x[1]-0.7)/sigma
		return -(a*a - 2*rho*a*b + b*b) / (2 * (1 - rho*rho))
	}
	r, err := quadrature.Integrate(context.Background(), quadrature.Problem{
		Density: func() quadrature.Density { return density },
		Lo:      []float64{0, 0}, Hi: []float64{1, 2},
		Classes: 2, Class: func(x []float64) int {
			if x[0]+x[1] > 1.3 {
				return 1
			}
			return 0
		},
	}, quadrature.DefaultOptions())
	if err != nil {
		fmt.Println(err)
		return
	}
	norm := 2 * math.Pi * sigma * sigma * math.Sqrt(1-rho*rho)
	fmt.Printf("evidence %.6f of the exact one\n", math.Exp(r.LogEvidence.Value)/norm)
	lower, upper := r.Marginals[0].Interval(0.95)
	fmt.Printf("first: %.4f ± %.4f, 95%% [%.4f, %.4f]\n", r.Marginals[0].Mean, r.Marginals[0].SD, lower, upper)
	fmt.Printf("sum above 1.3: %.3e, to %.0e\n", r.Classes[1].Value, r.Classes[1].Err)
	difference := r.Nodes.Mean(func(x []float64) float64 { return x[1] - x[0] })
	fmt.Printf("difference: %.4f\n", difference.Value)
	// Output:
	// evidence 1.000000 of the exact one
	// first: 0.3000 ± 0.0500, 95% [0.2020, 0.3980]
	// sum above 1.3: 3.981e-04, to 2e-09
	// difference: 0.4000
}
