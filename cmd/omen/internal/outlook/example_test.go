package outlook_test

import (
	"fmt"

	"omen/cmd/omen/internal/outlook"
	"omen/model"
)

func ExampleLabelOf() {
	l := outlook.LabelOf(model.Universe{Om: 0.3, OL: 0.8, W0: -0.9, Wa: -0.3})
	fmt.Println(l.Fate)
	fmt.Println(l.Held, "if w stays as it is")
	for _, s := range outlook.Today() {
		if s.Holds(l) {
			fmt.Println(s.Name)
		}
	}
	// Output:
	// recollapse (big crunch)
	// expands forever, accelerating if w stays as it is
	// accelerating
	// closed (Ok < 0)
}
