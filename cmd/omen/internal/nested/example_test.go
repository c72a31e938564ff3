package nested_test

import (
	"fmt"

	"omen/cmd/omen/internal/nested"
	"omen/likelihood"
)

func ExampleModels() {
	om, _ := likelihood.Flat(0, 1)
	ol, _ := likelihood.Flat(0, 1.5)
	family := likelihood.Family{Free: []likelihood.Parameter{{Name: "Om", Prior: om}, {Name: "OL", Prior: ol}}}
	for _, m := range nested.Models(family) {
		fmt.Println(m.Name, len(m.Family.Free))
	}
	// Output:
	// coasting 0
	// critical 0
	// matter-only 1
	// flat-lambda 1
	// curved-lambda 2
}
