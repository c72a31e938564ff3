package outlook

import (
	"math"

	"omen/likelihood"
)

// Spread visits n points that fill the prior evenly: an additive recurrence on the
// powers of the root of g^(d+1) = g + 1 (Roberts 2018, "The unreasonable
// effectiveness of quasirandom sequences", from memory), through the priors'
// quantiles.
func Spread(space *likelihood.Space, n int, visit func(x []float64)) {
	free := space.Free()
	g := 1.5
	for range 60 {
		g = math.Pow(1+g, 1/float64(len(free)+1))
	}
	x := make([]float64, len(free))
	for k := range n {
		for i := range free {
			_, u := math.Modf(0.5 + float64(k)*math.Pow(g, -float64(i+1)))
			x[i] = free[i].Prior.Quantile(u)
		}
		visit(x)
	}
}
