package gather

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"omen/cmd/omen/internal/job/jobtest"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
)

// The lines of the plane are the published boundaries (Carroll, Press & Turner
// 1992, ARA&A 30, 499, eq. 12 and 14; their closed forms evaluated to 10 digits).
func TestDividers(t *testing.T) {
	s, err := likelihood.NewSpace(likelihood.Family{Free: []likelihood.Parameter{{Name: "Om", Prior: flat(t, 0, 3)}, {Name: "OL", Prior: flat(t, -1, 5)}}})
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	lines := map[string]func(om float64) float64{}
	for _, d := range dividers(s) {
		names = append(names, d.Left.String())
		lines[d.Left.String()] = func(om float64) float64 {
			i := min(max(slices.IndexFunc(d.X, func(x float64) bool { return x >= om }), 1), len(d.X)-1)
			return d.Y[i-1] + (om-d.X[i-1])/(d.X[i]-d.X[i-1])*(d.Y[i]-d.Y[i-1])
		}
	}
	if want := []string{"closed", "accelerates today", "expands forever", "no big bang"}; !slices.Equal(names, want) {
		t.Fatalf("dividers %q, expected %q", names, want)
	}
	for _, c := range []struct {
		name   string
		om, ol float64
	}{
		{"closed", 0.3, 0.7}, {"closed", 2, -1},
		{"accelerates today", 0.3, 0.15}, {"accelerates today", 2, 1},
		{"expands forever", 0.3, 0}, {"expands forever", 1, 0}, {"expands forever", 1.2, 0.00083337680}, {"expands forever", 2, 0.0418890660}, {"expands forever", 2.5, 0.0964445594},
		{"no big bang", 0.1, 1.35}, {"no big bang", 0.3, 1.7134604029}, {"no big bang", 0.5, 2}, {"no big bang", 1, 2.5980762114}, {"no big bang", 2, 3.5962666587},
	} {
		if got := lines[c.name](c.om); math.Abs(got-c.ol) > 1e-4 { // of linear interpolation
			t.Errorf("%s at Om = %g: OL = %.6f, published %.6f", c.name, c.om, got, c.ol)
		}
	}
}

func flat(t *testing.T, lo, hi float64) likelihood.Prior {
	t.Helper()
	p, err := likelihood.Flat(lo, hi)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// With w free only the line of flat space is one.
func TestDividersOfW(t *testing.T) {
	s, err := likelihood.NewSpace(likelihood.Family{DarkEnergy: likelihood.W, Free: []likelihood.Parameter{
		{Name: "Om", Prior: flat(t, 0, 1)}, {Name: "OL", Prior: flat(t, 0, 1)}, {Name: "w0", Prior: flat(t, -2, 0)}}})
	if err != nil {
		t.Fatal(err)
	}
	if d := dividers(s); len(d) != 1 {
		t.Errorf("%d dividers, expected 1", len(d))
	}
}

// A table by itself is fitted with the parameters that it needs, and agrees with
// its own published constraint.
func TestAlone(t *testing.T) {
	r := &Run{Run: &result.Run{Job: jobtest.Committed(t, "fate.toml"), Threads: 2}}
	for i, c := range []struct {
		free         []string
		om, sd, olIs float64
	}{
		{[]string{"Om", "OL"}, 0.294, 0.054, 0.609},          // grid integration of the condensed Pantheon+ table
		{[]string{"Om", "OL", "hrd"}, 0.2932, 0.0115, 0.683}, // grid integration of DESI DR2, Table IV
	} {
		a, err := r.alone(i)
		if err != nil {
			t.Fatal(err)
		}
		var free []string
		for _, p := range a.space.Free() {
			free = append(free, p.Name)
		}
		if !slices.Equal(free, c.free) {
			t.Errorf("table %d is fitted with %v, expected %v", i, free, c.free)
		}
		mean := func(k int) float64 {
			sum := 0.0
			x := a.check.Sample.Coordinate(k).Values()
			for _, v := range x {
				sum += v
			}
			return sum / float64(len(x))
		}
		if got := mean(0); math.Abs(got-c.om) > 0.15*c.sd {
			t.Errorf("table %d: Om %.4f, expected %.4f ± %.4f", i, got, c.om, c.sd)
		}
		if got := mean(1); math.Abs(got-c.olIs) > 0.02 {
			t.Errorf("table %d: OL %.4f, expected %.4f", i, got, c.olIs)
		}
	}
}

// The bands of many draws of a known distribution have its quantiles.
func TestBand(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	b := band{x: []float64{1, 2, 3}}
	for i := range 20000 {
		c := []float64{rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()}
		if i%5 == 0 { // a fifth of the universes ends before 2
			c[1] = math.NaN()
		}
		if i%20 == 0 { // a twentieth before 3
			c[2] = math.NaN()
		}
		b.curves = append(b.curves, c)
	}
	f := b.figure([]float64{0, 0, 0})
	for _, c := range [][2]float64{{f.Lo95[0], -1.96}, {f.Lo68[0], -0.9945}, {f.Hi68[0], 0.9945}, {f.Hi95[0], 1.96}} {
		if math.Abs(c[0]-c[1]) > 0.05 {
			t.Errorf("quantile %.3f, expected %.3f", c[0], c[1])
		}
	}
	if !math.IsNaN(f.Lo68[1]) {
		t.Errorf("a band where too little exists: %g", f.Lo68[1])
	}
	if math.Abs(f.Lo68[2]+0.9945) > 0.05 {
		t.Errorf("a band where nearly all exists: %g", f.Lo68[2])
	}
}

// The autocorrelation of an AR(1) series is ρ to the power of the lag.
func TestAutocorrelation(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	const rho = 0.8
	var all [][]float64
	for range 4 {
		x, v := []float64{}, 0.0
		for range 40000 {
			v = rho*v + math.Sqrt(1-rho*rho)*rng.NormFloat64()
			x = append(x, v)
		}
		x[0] = 1e6 // burn-in, to be skipped
		all = append(all, x)
	}
	got := autocorrelation(all, 1, 9)
	for _, lag := range []int{0, 1, 2, 5, 10} {
		if want := math.Pow(rho, float64(lag)); math.Abs(got[lag]-want) > 0.03 {
			t.Errorf("lag %d: %.3f, expected %.3f", lag, got[lag], want)
		}
	}
}

func TestScientific(t *testing.T) {
	set := func(times, exponent string) string { return "[" + times + "|" + exponent + "]" }
	for _, c := range [][2]string{
		{"< 1e-12", "< [|−12]"}, {"1 - 6.3e-5 (95%)", "1 - [6.3×|−5] (95%)"}, {"2.0e07", "[2.0×|7]"},
		{"0.086 ± 0.002", "0.086 ± 0.002"}, {"recollapse", "recollapse"},
	} {
		if got := Scientific(c[0], set); got != c[1] {
			t.Errorf("Scientific(%q) = %q, expected %q", c[0], got, c[1])
		}
	}
}

// A probability is drawn as what it is: no value is made a limit, and the bound of an
// integral is none of 95%.
func TestBar(t *testing.T) {
	nan := result.Number(math.NaN())
	for _, c := range []struct {
		f     result.Fate
		p     float64
		limit bool
		text  string
		level string
	}{
		{result.Fate{Probability: 7.6e-11, Error: 1e-14, Upper95: nan, Exact: true}, 7.6e-11, false, "7.6×10^−11", "95% upper limit"},
		{result.Fate{Probability: 0, Error: nan, Upper95: 1e-12, Exact: true}, 1e-12, true, "< 10^−12", "upper limit"},
		{result.Fate{Probability: 0, Error: nan, Upper95: 0.00021}, 0.00021, true, "< 0.00021", "95% upper limit"},
		{result.Fate{Probability: 0.934, Error: 0.002, Upper95: nan}, 0.934, false, "0.934 ± 0.002", "95% upper limit"},
	} {
		list := []result.Fate{c.f}
		if b, level := bar(list, ""), limitLevel([]FateSeries{{Fates: list}}); b.P != c.p || b.Limit != c.limit || b.Text.String() != c.text || level != c.level {
			t.Errorf("%+v: bar %+v, %s; expected %+v", c.f, b, level, c)
		}
	}
}

// What cannot be drawn says why.
func TestAbsent(t *testing.T) {
	r := &Run{Run: &result.Run{Job: jobtest.Committed(t, "bao-flat.toml")}, Summary: &result.Summary{Complete: true}}
	p, err := r.plane()
	if err != nil || p.Why == "" {
		t.Errorf("the plane of a flat run: %+v, %v", p, err)
	}
	if p, err = r.fates(); err != nil || p.Why == "" {
		t.Errorf("the fates of a run without: %+v, %v", p, err)
	}
}
