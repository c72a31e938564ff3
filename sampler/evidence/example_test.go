package evidence_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"omen/sampler/evidence"
)

// A straight line through zero is compared with one with a free offset.
func Example() {
	const n, sigma = 20, 0.1
	rng := rand.New(rand.NewPCG(1, 1))
	var x, y []float64
	for i := range n {
		x = append(x, float64(i)/n)
		y = append(y, 2*x[i]+sigma*rng.NormFloat64())
	}
	// flat priors on slope and offset, normalised
	lo, hi := []float64{-5, -5}, []float64{5, 5}
	posterior := func(p []float64) float64 {
		s := 0.0
		for i := range x {
			r := (y[i] - p[0]*x[i]) / sigma
			if len(p) == 2 {
				r -= p[1] / sigma
			}
			s -= r * r / 2
		}
		return s - float64(len(p))*math.Log(10)
	}
	var evidences []evidence.Estimate
	for dim := 1; dim <= 2; dim++ {
		t := evidence.Target{Density: func() func([]float64) float64 { return posterior }, Lo: lo[:dim], Hi: hi[:dim]}
		r, err := evidence.Bridge(context.Background(), walk(posterior, dim, rng), t, 1)
		if err != nil {
			fmt.Println(err)
			return
		}
		evidences = append(evidences, r.LogEvidence)
	}
	p, err := evidence.Probabilities(evidences, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	b := evidence.LogBayesFactor(evidences[0], evidences[1])
	fmt.Printf("ln Bayes factor for no offset: %.1f\n", b.Value)
	fmt.Printf("probability of an offset: %.2f\n", p[1].Value)
	// Output:
	// ln Bayes factor for no offset: 4.5
	// probability of an offset: 0.01
}

// walk samples by a random walk from near the truth; its draws are worth one in thirty.
func walk(posterior func([]float64) float64, dim int, rng *rand.Rand) evidence.Sample {
	s := evidence.Sample{ESS: 1000}
	p, q := []float64{2, 0}[:dim], make([]float64, dim)
	v := posterior(p)
	for range 30000 {
		for i := range q {
			q[i] = p[i] + 0.06*rng.NormFloat64()
		}
		if w := posterior(q); math.Log(rng.Float64()) < w-v {
			v = w
			copy(p, q)
		}
		s.X, s.LogP = append(s.X, p...), append(s.LogP, v)
	}
	return s
}
