package density_test

import (
	"fmt"
	"math/rand/v2"

	"omen/cmd/omen/internal/density"
)

func ExampleEstimate() {
	r := rand.New(rand.NewPCG(1, 1))
	draws := make([]float64, 20000)
	for i := range draws {
		draws[i] = r.ExpFloat64() // falls from its hard edge at zero
	}
	edges := density.NoEdges()
	edges.Lo = 0
	c, err := density.Estimate(draws, nil, 0, edges)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, v := range c.Intervals(0.68) {
		fmt.Printf("68%% between %.0f and %.1f\n", v.Lo, v.Hi)
	}
	// Output: 68% between 0 and 1.1
}
