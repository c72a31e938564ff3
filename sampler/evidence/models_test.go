package evidence

import (
	"math"
	"math/rand/v2"
	"testing"
)

func TestCriteria(t *testing.T) {
	// by hand: ln L = −12.5, 3 parameters, 100 data
	if got := AIC(-12.5, 3); got != 31 {
		t.Errorf("AIC %g, want 31", got)
	}
	if got, want := BIC(-12.5, 3, 100), 25+3*4.605170185988092; math.Abs(got-want) > 1e-12 {
		t.Errorf("BIC %g, want %g", got, want)
	}
	if !math.IsNaN(BIC(-1, 1, 0)) {
		t.Error("BIC of no data is not NaN")
	}
	if got := LogBayesFactor(Estimate{-3, 0.3}, Estimate{-5, 0.4}); got.Value != 2 || math.Abs(got.Err-0.5) > 1e-15 {
		t.Errorf("ln Bayes factor %v, want 2 ± 0.5", got)
	}
}

func TestProbabilities(t *testing.T) {
	ln := math.Log
	for _, c := range []struct {
		name string
		z    []Estimate
		odds []float64
		want []float64
	}{
		{"equal", []Estimate{{-7000, 0}, {-7000, 0}}, nil, []float64{0.5, 0.5}},
		{"three to one", []Estimate{{900 + ln(3), 0}, {900, 0}}, nil, []float64{0.75, 0.25}},
		{"odds", []Estimate{{0, 0}, {0, 0}, {ln(2), 0}}, []float64{1, 5, 2}, []float64{0.1, 0.5, 0.4}},
		{"impossible", []Estimate{{math.Inf(-1), math.NaN()}, {5, 0.1}}, nil, []float64{0, 1}},
		{"excluded", []Estimate{{9, 0}, {5, 0.1}}, []float64{0, 3}, []float64{0, 1}},
	} {
		p, err := Probabilities(c.z, c.odds)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		for i, want := range c.want {
			if math.Abs(p[i].Value-want) > 1e-12 || math.IsNaN(p[i].Err) {
				t.Errorf("%s: model %d has %v, want %g", c.name, i, p[i], want)
			}
		}
	}
	for name, c := range map[string]struct {
		z    []Estimate
		odds []float64
	}{
		"none possible": {[]Estimate{{math.Inf(-1), 0}}, nil},
		"none at all":   {nil, nil},
		"not a number":  {[]Estimate{{math.NaN(), 0}, {1, 0}}, nil},
		"odds missing":  {[]Estimate{{0, 0}, {1, 0}}, []float64{1}},
		"negative odds": {[]Estimate{{0, 0}, {1, 0}}, []float64{1, -1}},
	} {
		if p, err := Probabilities(c.z, c.odds); err == nil {
			t.Errorf("%s: %v, no error", name, p)
		}
	}
}

// The errors against the scatter of probabilities over scattered evidences.
func TestProbabilityErrors(t *testing.T) {
	z := []Estimate{{1, 0.02}, {0.3, 0.05}, {-1, 0.01}}
	p, err := Probabilities(z, nil)
	if err != nil {
		t.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(1, 1))
	const trials = 20000
	var v [3]float64
	for range trials {
		y := make([]Estimate, len(z))
		for i := range z {
			y[i].Value = z[i].Value + z[i].Err*rng.NormFloat64()
		}
		q, err := Probabilities(y, nil)
		if err != nil {
			t.Fatal(err)
		}
		for i := range q {
			v[i] += math.Pow(q[i].Value-p[i].Value, 2) / trials
		}
	}
	for i := range p {
		if r := math.Sqrt(v[i]) / p[i].Err; math.Abs(r-1) > 0.03 {
			t.Errorf("model %d: scatter %.2f of the error", i, r)
		}
	}
}

func TestLogSumExp(t *testing.T) {
	for _, c := range []struct {
		x    []float64
		want float64
	}{
		{[]float64{-5000, -5000}, -5000 + math.Ln2},
		{[]float64{800, 1}, 800},
		{[]float64{math.Inf(-1), 2}, 2},
		{nil, math.Inf(-1)},
		{[]float64{math.Inf(-1), math.Inf(-1)}, math.Inf(-1)},
	} {
		if got := LogSumExp(c.x...); got != c.want {
			t.Errorf("LogSumExp(%v) = %g, want %g", c.x, got, c.want)
		}
	}
}
