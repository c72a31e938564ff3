package model

import (
	"math"
	"math/rand/v2"
	"testing"
)

// Distances at the nodes, between them and at further redshifts against the integral for one redshift at a time:
// as good as the nodes say they are, over the prior of a fit and in every family.
func TestNodes(t *testing.T) {
	rng := rand.New(rand.NewPCG(31, 32))
	further := []float64{0.01, 0.51, 1.3, 2.33}
	const span = 2.33
	used := 0
	for _, n := range []int{NodesFor(span), 2 * NodesFor(span)} {
		p, err := NewNodes(span, n, further)
		if err != nil {
			t.Fatal(err)
		}
		s := p.Sight()
		row := make([]float64, n)
		for range 300 {
			u := Universe{Om: 1.5 * rng.Float64(), OL: -0.5 + 2.3*rng.Float64(), H0: 70, W0: -1}
			switch rng.IntN(4) {
			case 1:
				u.Or = 1e-3 * rng.Float64()
			case 2:
				u.W0 = -2 + 2.5*rng.Float64()
			case 3:
				u.W0, u.Wa = -2+2.5*rng.Float64(), -2+3*rng.Float64()
			}
			omitted := p.Fill(u, s)
			if !(omitted < 1e-9) {
				continue
			}
			used++
			within := 4*omitted + 2e-12 // the rest is what DM itself promises
			unit := C / u.H0
			for i, z := range further {
				if d := math.Abs(s.DM[i]*unit/u.DM(z) - 1); d > within {
					t.Errorf("%+v: DM(%v) differs by %.2g, %.2g omitted", u, z, d, omitted)
				}
				if d := math.Abs(s.DH[i]*unit/u.DH(z) - 1); d > 1e-13 {
					t.Errorf("%+v: DH(%v) differs by %.2g", u, z, d)
				}
			}
			z := span * rng.Float64()
			p.Interpolation(z, row)
			got := 0.0
			for k, b := range row {
				got += b * s.Shape[k]
			}
			last := make([]float64, 0, lastCoefficients)
			for _, weights := range p.LastCoefficients() {
				c := 0.0
				for k, b := range weights {
					c += b * s.Shape[k]
				}
				last = append(last, c)
			}
			want := math.Log(u.DM(z) / unit / z)
			if d := math.Abs(got - want); d > within+4*Remainder(last) {
				t.Errorf("%+v: ln(DM/z) at %v differs by %.2g, %.2g and %.2g omitted", u, z, d, omitted, Remainder(last))
			}
		}
	}
	if used < 300 {
		t.Errorf("only %d universes were good enough", used)
	}
}

// A flat universe needs no more nodes than NodesFor says.
func TestNodesFor(t *testing.T) {
	for _, span := range []float64{0.1, 0.5, 1, 2.3, 4, 10} {
		n := NodesFor(span)
		p, err := NewNodes(span, n, nil)
		if err != nil {
			t.Fatal(err)
		}
		s := p.Sight()
		for om := 0.05; om < 1; om += 0.05 {
			if omitted := p.Fill(Universe{Om: om, OL: 1 - om, W0: -1, H0: 70}, s); !(omitted < 1e-13) {
				t.Errorf("%d nodes to z = %v, Om = %.2f: %.2g omitted", n, span, om, omitted)
			}
		}
	}
}

// Cardinals integrate to the integral of one, for any number of nodes: the rule behind them must be exact.
func TestNodesIntegration(t *testing.T) {
	for n := FewestNodes; n < 130; n++ {
		p, err := NewNodes(2, n, nil)
		if err != nil {
			t.Fatal(err)
		}
		row := make([]float64, n+1)
		for _, y := range []float64{1e-3, 0.3, math.Log(3)} {
			p.integration(y, row)
			sum := 0.0
			for _, w := range row {
				sum += w
			}
			if math.Abs(sum/y-1) > 1e-13 {
				t.Errorf("%d nodes: the integral of 1 to %v is %v", n, y, sum)
			}
		}
	}
}

// Where a universe has no distances the nodes say so.
func TestNodesOutsideDomain(t *testing.T) {
	p, err := NewNodes(2.3, 24, nil)
	if err != nil {
		t.Fatal(err)
	}
	s := p.Sight()
	for _, u := range []Universe{
		{Om: 0.1, OL: 1.5, W0: -1, H0: 70},    // bounced at z = 1.6
		{Om: 0.3, OL: 1.7134, W0: -1, H0: 70}, // loitered
		{Om: math.NaN(), OL: 0.7, W0: -1, H0: 70},
	} {
		if omitted := p.Fill(u, s); omitted < 1e-4 {
			t.Errorf("%+v: %v omitted", u, omitted)
		}
	}
	for _, c := range []struct {
		span    float64
		n       int
		further []float64
	}{{0, 20, nil}, {math.Inf(1), 20, nil}, {1, 3, nil}, {1, 20, []float64{1.1}}, {1, 20, []float64{0}}} {
		if _, err := NewNodes(c.span, c.n, c.further); err == nil {
			t.Errorf("no error for %+v", c)
		}
	}
}

func TestLogarithms(t *testing.T) {
	rng := rand.New(rand.NewPCG(33, 34))
	for range 200_000 {
		x := []float64{math.Exp(8 * rng.NormFloat64())}
		want := math.Log(x[0])
		logarithms(x)
		if d := math.Abs(x[0] - want); d > 4e-16*math.Max(1, math.Abs(want)) {
			t.Fatalf("ln %v differs by %.2g", math.Exp(want), d)
		}
	}
	x := []float64{1, 0, -1, math.NaN(), math.Inf(1), 5e-324, math.MaxFloat64}
	want := []float64{0, math.Inf(-1), math.NaN(), math.NaN(), math.Inf(1), math.Log(5e-324), math.Log(math.MaxFloat64)}
	logarithms(x)
	for i := range x {
		if math.IsNaN(want[i]) != math.IsNaN(x[i]) || math.Abs(x[i]-want[i]) > 1e-15 {
			t.Errorf("got %v, want %v", x[i], want[i])
		}
	}
}

func TestExponentials(t *testing.T) {
	rng := rand.New(rand.NewPCG(95, 96))
	for range 20000 {
		x := [3]float64{-708 + 1400*rng.Float64(), 20*rng.Float64() - 10, rng.NormFloat64() * math.Pow(10, -20*rng.Float64())}
		got := x
		exponentials(got[:])
		for i, v := range x {
			want := math.Exp(v)
			if !(math.Abs(got[i]-want) <= 4e-16*want) {
				t.Fatalf("exp %v = %v, want %v", v, got[i], want)
			}
		}
	}
	special := []float64{0, math.Copysign(0, -1), 1e300, -1e300, math.Inf(1), math.Inf(-1), 699.9, -699.9, 709.5, -745}
	got := append([]float64{math.NaN()}, special...)
	exponentials(got)
	if !math.IsNaN(got[0]) {
		t.Errorf("exp NaN = %v", got[0])
	}
	for i, v := range special {
		if want := math.Exp(v); got[i+1] != want && !(math.Abs(got[i+1]/want-1) <= 4e-16) {
			t.Errorf("exp %v = %v, want %v", v, got[i+1], want)
		}
	}
}

func BenchmarkNodes(b *testing.B) {
	p, err := NewNodes(2.33, NodesFor(2.33), []float64{0.295, 0.51, 0.706, 0.934, 1.321, 1.484, 2.33})
	if err != nil {
		b.Fatal(err)
	}
	s := p.Sight()
	benchmarkEach(b, func(u Universe) { p.Fill(u, s) })
}
