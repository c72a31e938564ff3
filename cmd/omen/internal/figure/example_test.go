package figure_test

import (
	"bytes"
	"fmt"
	"math"

	"omen/cmd/omen/internal/figure"
)

func ExampleDrawFates() {
	f, err := figure.DrawFates(figure.Fates{
		Rows: []figure.Label{figure.Plain("recollapse (big crunch)"), figure.Plain("expands forever, accelerating"), figure.Plain("coasting")},
		Series: []figure.FateSeries{{
			Name:   figure.Plain("curved, with Λ"),
			Values: []figure.Probability{{P: 2e-4, Limit: true}, {P: 0.9987, Err: 0.0004}, {P: math.NaN()}},
		}},
		LimitLevel: figure.Plain("95% upper limit"),
	}, figure.Column)
	if err != nil {
		fmt.Println(err)
		return
	}
	var page bytes.Buffer
	if err := f.WriteInlineSVG(&page, "fates", "The universe almost surely expands forever."); err != nil {
		fmt.Println(err)
	}
	fmt.Println(f.Title, bytes.Contains(page.Bytes(), []byte("0.9987 ± 0.0004")))
	// Output: Probability of each fate true
}
