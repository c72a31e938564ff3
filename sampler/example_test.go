package sampler_test

import (
	"context"
	"fmt"
	"log"

	"omen/sampler"
)

// A straight line y = a + b·t through five points with errors of 0.1, and the
// probability that it falls.
func Example() {
	t := []float64{0, 1, 2, 3, 4}
	y := []float64{1.04, 1.08, 0.93, 1.01, 0.88}
	density := func(x []float64) float64 {
		chi2 := 0.0
		for i := range t {
			r := (y[i] - x[0] - x[1]*t[i]) / 0.1
			chi2 += r * r
		}
		return -chi2 / 2
	}
	lo, hi := []float64{-10, -10}, []float64{10, 10}
	settings := sampler.DefaultSettings()

	best, _, err := sampler.Maximise(density, lo, hi, settings.Seed)
	if err != nil {
		log.Fatal(err)
	}
	densities := make([]sampler.Density, 4)
	start := make([][]float64, len(densities))
	for m := range densities {
		densities[m] = density // it has no scratch memory of its own to share
		start[m], err = sampler.Scatter(density, best, lo, hi, sampler.DefaultWalkers(len(best)), settings.Seed, m)
		if err != nil {
			log.Fatal(err)
		}
	}
	chain, err := sampler.NewChain(len(best), start, 1, sampler.DefaultRecord)
	if err != nil {
		log.Fatal(err)
	}
	outcome, err := sampler.Run(context.Background(), densities, chain, settings, nil)
	if err != nil {
		log.Fatal(err)
	}

	sample := outcome.Check.Sample
	slope := sampler.Summarize(sample.Coordinate(1))
	falls := sampler.Proportion(sample.Map(func(x []float64) float64 {
		if x[1] < 0 {
			return 1
		}
		return 0
	}), outcome.Check.ESS())
	fmt.Println(outcome.Stop)
	fmt.Printf("best fit %.4f %.4f\n", best[0], best[1])
	fmt.Printf("slope %.2f ± %.2f\n", slope.Mean, slope.SD)
	fmt.Printf("falls with probability %.1f, known to better than 0.02: %t\n", falls.P, falls.Error < 0.02)
	// Output:
	// converged
	// best fit 1.0660 -0.0390
	// slope -0.04 ± 0.03
	// falls with probability 0.9, known to better than 0.02: true
}
