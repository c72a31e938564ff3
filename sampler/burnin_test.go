package sampler

import (
	"math"
	"math/rand/v2"
	"testing"
)

// transient returns the log-density and one parameter of four ensembles that
// relax over a known time from a start shift away and wide times too wide.
func transient(seed uint64, rho, shift, wide, relaxation float64, n int) (logp, x Draws) {
	rng := rand.New(rand.NewPCG(seed, 77))
	var all, density [][]float64
	for range 4 {
		e := interleave(ar1(rng, rho, 8, n)...)
		p := make([]float64, len(e))
		for i := range e {
			decay := math.Exp(-float64(i/8) / relaxation)
			e[i] = e[i]*(1+(wide-1)*decay) + shift*decay
			p[i] = -e[i] * e[i] / 2
		}
		all, density = append(all, e), append(density, p)
	}
	return NewDraws(8, density...), NewDraws(8, all...)
}

func TestBurnInCoversAKnownTransient(t *testing.T) {
	const n, relaxation = 2000, 50
	for _, c := range []struct {
		name        string
		shift, wide float64
	}{{"shifted", 10, 1}, {"too wide", 0, 10}, {"both", 3, 3}} {
		for seed := range uint64(10) {
			logp, x := transient(seed, 0.8, c.shift, c.wide, relaxation, n)
			drop := burnIn(logp, []Draws{x})
			// The bias of what is left of the start, beside the error of the mean.
			left := (c.shift + c.wide - 1) * math.Exp(-float64(drop)/relaxation)
			bias, mcse := left*relaxation/float64(n-drop), MCSE(x.after(drop))
			if bias > mcse || drop > n/4 {
				t.Errorf("%s, seed %d: discards %d of %d, which leaves a bias of %v for an error of %v", c.name, seed, drop, n, bias, mcse)
			}
		}
	}
}

// A start that is too wide in one parameter of many hardly moves the
// log-density: the parameter's squares must see it.
func TestBurnInSeesWidthWithoutLogDensity(t *testing.T) {
	_, x := transient(1, 0.8, 0, 10, 50, 2000)
	quiet, _ := transient(2, 0.8, 0, 1, 1, 2000)
	if drop := burnIn(quiet, []Draws{x}); drop < 2*60 {
		t.Errorf("discards %d of a relaxation over 50 steps from ten times the width", drop)
	}
}

// A chain that starts in equilibrium loses its five autocorrelation times and
// rarely more.
func TestBurnInOfAStationaryChain(t *testing.T) {
	const n, tau = 2000, 9
	more := 0
	for seed := range uint64(40) {
		logp, x := transient(seed, 0.8, 0, 1, 1, n)
		drop := burnIn(logp, []Draws{x})
		if drop < 3*burnTimes*tau/4 {
			t.Errorf("seed %d: discards %d, less than five τ = %d", seed, drop, burnTimes*tau)
		}
		if drop > 2*burnTimes*tau {
			more++
		}
	}
	if more > 4 {
		t.Errorf("discards much more than five τ in %d of 40", more)
	}
}

// A chain that never settles loses half, and one of nothing, nothing.
func TestBurnInAtItsLimits(t *testing.T) {
	ramp := make([]float64, 1000)
	for i := range ramp {
		ramp[i] = float64(i)
	}
	d := NewDraws(1, ramp, ramp)
	if drop := burnIn(d, []Draws{d}); drop != 500 {
		t.Errorf("a ramp loses %d of 1000, want 500", drop)
	}
	if drop := burnIn(NewDraws(1), []Draws{NewDraws(1)}); drop != 0 {
		t.Errorf("nothing loses %d", drop)
	}
}

// Dropping the first 3 is best of (9, 9, 9, then ±1): worked by hand.
func TestMSER(t *testing.T) {
	if d := mser([]float64{9, 9, 9, 1, -1, 1, -1, 1, -1, 1, -1}); d != 3 {
		t.Errorf("drops %d, want 3", d)
	}
}
