package result

import (
	"math"
	"strings"
	"testing"

	"omen/model"
)

// Weights of any size have a finite worth.
func TestSampleWeights(t *testing.T) {
	for _, c := range []struct {
		first, others float64
		want          string
	}{
		{1e308, 1e308, "worth 20 rows"},
		{1e300, 1e-300, "worth 1 rows"},
		{1e-300, 1e-300, "worth 20 rows"},
	} {
		s := Sample{Names: []string{"Om"}}
		for i := range 20 {
			om := 0.3 + 0.001*float64(i*i%7)
			s.Universes = append(s.Universes, model.Universe{Om: om, OL: 1 - om, H0: 70, W0: -1})
			s.Weights = append(s.Weights, c.others)
		}
		s.Weights[0] = c.first
		got := OfSample(s)
		if text := strings.Join(got.Assumptions, "\n"); !strings.Contains(text, c.want) || math.IsNaN(float64(got.Parameters[0].Mean)) {
			t.Errorf("%g among %g: %v in\n%s", c.first, c.others, got.Parameters[0], text)
		}
	}
}
