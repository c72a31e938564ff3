package gather_test

import (
	"fmt"

	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/result"
)

func ExampleValue() {
	q := result.Quantity{Name: "H0", Unit: "km/s/Mpc", Mean: 68.512, SD: 0.583, MCSE: 0.009, Constrained: true}
	fmt.Println(gather.Value(q))
	// Output: H0 68.51 ± 0.58 km/s/Mpc
}
