package result

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/runfile"
	"omen/model"
	"omen/sampler"
)

// A chain that is off is found out: by the statistic, and in units of its own error.
func TestDisagreement(t *testing.T) {
	e := Quantity{Name: "Om", Mean: 0.3, SD: 0.01, Median: 0.3, Interval68: [2]Number{0.29, 0.31}, Interval95: [2]Number{0.28, 0.32}}
	c := e
	c.MCSE, c.mcseSD, c.mcseMedian = 1e-4, 1e-4, 1e-4
	c.MCSE68, c.MCSE95 = [2]Number{1e-4, 1e-4}, [2]Number{2e-4, 2e-4}
	c.Mean, c.Interval95[1] = 0.3006, 0.3209
	d := disagreement([]Quantity{c}, []Quantity{e})
	if d.Statistic != "upper end of 95%" || math.Abs(float64(d.Widths)-0.09) > 1e-9 || math.Abs(float64(d.MonteCarlo)-0.02) > 1e-9 {
		t.Errorf("largest difference %+v", d)
	}
	if d.Of != "Om, mean" || math.Abs(float64(d.Sigmas)-6) > 1e-6 {
		t.Errorf("in its own errors %+v", d)
	}
	if got := d.Allowance(); got != ", its Monte Carlo error there being 0.020" {
		t.Errorf("allowance %q", got)
	}
	if got := (&Disagreement{MonteCarlo: Number(math.NaN())}).Allowance(); got != "" {
		t.Errorf("allowance %q of an error that is not known", got)
	}
	r := Run{Job: &job.Job{Run: &runfile.Run{}}}
	w := exactWarnings(r, &Summary{Engine: Engine{Largest: d}})
	if len(w) != 1 || !strings.Contains(w[0], "chain and quadrature disagree: Om, mean by 6.0") {
		t.Errorf("warnings %q", w)
	}
	d.Sigmas = 4
	if w := exactWarnings(r, &Summary{Engine: Engine{Largest: d}}); len(w) != 0 {
		t.Errorf("warnings %q", w)
	}
}

// Times are those of the draws in which they come to be, if there are enough.
func TestDrawnTime(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	x := make([]float64, 4000)
	for i := range x {
		x[i] = math.NaN()
		if i%4 == 0 {
			x[i] = 20 + rng.NormFloat64()
		}
	}
	got := drawnTime(Time{}, sampler.NewDraws(1, x))
	if math.Abs(float64(got.Probability)-0.25) > 1e-12 || math.Abs(float64(got.Median)-20) > 0.15 || !(got.ESS > 500 && got.ESS < 1600) {
		t.Errorf("%+v", got)
	}
	for i := 80; i < len(x); i++ {
		x[i] = math.NaN()
	}
	none := Number(math.NaN())
	if got := drawnTime(Time{Median: none}, sampler.NewDraws(1, x)); got.Probability != 0.005 || !math.IsNaN(float64(got.Median)) {
		t.Errorf("of 20 draws: %+v", got)
	}
}

// A sample of one kind has the other kinds as limits, and what cannot be is left out.
func TestOfSample(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	s := Sample{Names: []string{"Om", "w0"}}
	for range 3000 {
		om := 0.3 + 0.02*rng.NormFloat64()
		s.Universes = append(s.Universes, model.Universe{Om: om, OL: 1 - om, H0: 70, W0: -1 + 0.1*rng.NormFloat64()})
	}
	got := OfSample(s)
	var names []string
	for _, f := range append(got.Fates, got.Today...) {
		names = append(names, f.Name)
	}
	want := "recollapse (big crunch); expands forever, accelerating; expands forever, decelerating; big rip; no big bang in the past; accelerating"
	if strings.Join(names, "; ") != want {
		t.Errorf("fates %q", names)
	}
	if p := got.Fates[3].Probability; math.Abs(float64(p)-0.5) > 0.04 {
		t.Errorf("P(rip) = %v", p)
	}
	for _, q := range got.Derived {
		if q.Name == "age" || q.Name == "Ok" {
			t.Errorf("%s of a flat sample without H0", q.Name)
		}
	}
	if len(got.Times) < 2 || got.Times[1].Unit != "1/H0" {
		t.Errorf("times %+v", got.Times)
	}
}

// A parameter that is the same in every row says nothing of what the sample is worth;
// if all are, nothing does.
func TestOfSampleWithoutSpread(t *testing.T) {
	for _, c := range []struct {
		width   float64
		warning string
	}{{0.02, ""}, {0, "no parameter varies"}} {
		rng := rand.New(rand.NewPCG(7, 8))
		s := Sample{Names: []string{"Om", "H0"}, KnowsH0: true}
		for range 3000 {
			om := 0.3 + c.width*rng.NormFloat64()
			s.Universes = append(s.Universes, model.Universe{Om: om, OL: 1 - om, H0: 70, W0: -1})
		}
		got := OfSample(s)
		if text := strings.Join(got.Warnings, "; "); (text == "") != (c.warning == "") || !strings.Contains(text, c.warning) {
			t.Errorf("width %v: warnings %q, want %q", c.width, text, c.warning)
		}
		limit := float64(got.Fates[0].Upper95)
		if (c.width > 0) != (limit > 0 && limit < 0.01) {
			t.Errorf("width %v: P(recollapse) < %v", c.width, limit)
		}
	}
}
