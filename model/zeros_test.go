package model

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestBigBangByScanning compares HasBigBang, and where the expansion stops, with a scan of E² over 17 decades.
func TestBigBangByScanning(t *testing.T) {
	rng := rand.New(rand.NewPCG(61, 62))
	for range 1000 {
		u := randomUniverse(rng)
		if onBoundary(u) || u.OL < 0 && math.Abs(u.W0+u.Wa) < 0.08 {
			continue
		}
		least := math.Inf(1)
		last := 0.0 // the latest a with E² < 0
		for s := -40.0; s < 0; s += 0.01 {
			v := u.E2(math.Exp(s))
			least = math.Min(least, v)
			if v <= 0 {
				last = math.Exp(s)
			}
		}
		e := u.expansion()
		zero := e.pastZero()
		if u.HasBigBang() != (zero == 0) {
			t.Fatalf("%+v: big bang %v, but E² = 0 at a = %v", u, u.HasBigBang(), zero)
		}
		if least <= 0 && u.HasBigBang() {
			t.Fatalf("%+v: big bang, but E² = %v on the way", u, least)
		}
		// A dip between two points of the scan is shallow: E² changes by less than 20 E²·0.01 over a step.
		if least > 0.05 && !u.HasBigBang() {
			t.Fatalf("%+v: no big bang, but E² ≥ %v", u, least)
		}
		if last > 0 && math.Abs(math.Log(zero/last)) > 0.01 {
			t.Fatalf("%+v: bounce at %v, scan says %v", u, zero, last)
		}
	}
}

// TestZeroIsZero: E² vanishes at the zeros that are reported, is positive between them and today, and negative
// just beyond.
func TestZeroIsZero(t *testing.T) {
	rng := rand.New(rand.NewPCG(63, 64))
	n := 0
	for range 6000 {
		u := randomUniverse(rng)
		if onBoundary(u) {
			continue
		}
		e := u.expansion()
		for _, a := range []float64{e.pastZero(), e.futureZero()} {
			if a == 0 || math.IsInf(a, 1) {
				continue
			}
			n++
			s := math.Log(a)
			r, dr := e.reduced(s)
			if math.Abs(r/dr) > 1e-13*math.Max(1, math.Abs(s)) {
				t.Fatalf("%+v: a²E² = %v with slope %v at its zero %v", u, r, dr, a)
			}
			for i := range 50 {
				if between := s * float64(i) / 50; e.sign(math.Exp(between)) <= 0 {
					t.Fatalf("%+v: E² ≤ 0 at ln a = %v, before its zero at %v", u, between, s)
				}
			}
			if e.sign(math.Exp(s+math.Copysign(1e-7, s))) >= 0 {
				t.Fatalf("%+v: E² does not change sign at its zero %v", u, a)
			}
		}
	}
	if n < 1000 {
		t.Errorf("only %d zeros", n)
	}
}

// TestCubicRoots: cubics made from their roots, also with a leading coefficient that nearly vanishes.
func TestCubicRoots(t *testing.T) {
	rng := rand.New(rand.NewPCG(65, 66))
	for range 5000 {
		r := [3]float64{4*rng.Float64() - 1, 4*rng.Float64() - 1, math.Pow(10, 12*rng.Float64()-2)}
		k := 1 / r[2]
		c := [4]float64{-k * r[0] * r[1] * r[2], k * (r[0]*r[1] + r[0]*r[2] + r[1]*r[2]), -k * (r[0] + r[1] + r[2]), k}
		got, n := cubicRoots(c, 0, math.Inf(1))
		want := 0
		for _, x := range r {
			if x <= 0 || math.Abs(r[0]-r[1]) < 1e-3 || math.Abs(x-r[2]) < 1e-3 && x != r[2] {
				continue
			}
			want++
			found := false
			for _, y := range got[:n] {
				found = found || math.Abs(y-x) < 1e-9*math.Max(1, x)
			}
			if !found {
				t.Fatalf("roots %v: %v not among %v", r, x, got[:n])
			}
		}
		for i := 1; i < n; i++ {
			if got[i] <= got[i-1] {
				t.Fatalf("roots %v do not ascend", got[:n])
			}
		}
		if n < want {
			t.Fatalf("roots %v: got %v", r, got[:n])
		}
	}
	for _, c := range []struct {
		c    [4]float64
		want int
	}{
		{[4]float64{}, 0}, {[4]float64{1}, 0}, {[4]float64{-1, 2}, 1}, {[4]float64{2, -3, 1}, 2}, {[4]float64{1, 0, 1}, 0},
		{[4]float64{-1, 0, 0, 1}, 1}, {[4]float64{1, 1, 1, 1}, 0},
	} {
		if _, n := cubicRoots(c.c, 0, math.Inf(1)); n != c.want {
			t.Errorf("%v: %d roots, want %d", c.c, n, c.want)
		}
	}
}

// TestAccelerationOnset compares with a scan of the deceleration parameter.
func TestAccelerationOnset(t *testing.T) {
	rng := rand.New(rand.NewPCG(67, 68))
	seen := [3]int{}
	for range 3000 {
		u := randomUniverse(rng)
		z := u.AccelerationOnset()
		e := u.expansion()
		start := math.Max(-20, math.Log(e.pastZero()))
		onset := math.NaN()
		if u.Q0() < 0 {
			onset = math.Inf(1)
			for s := 0.0; s > start; s -= 1e-3 {
				if _, dr := e.reduced(s); dr <= 0 {
					onset = math.Exp(-s) - 1
					break
				}
			}
		}
		switch {
		case math.IsNaN(onset):
			seen[0]++
			if !math.IsNaN(z) {
				t.Fatalf("%+v: onset %v, q0 %v", u, z, u.Q0())
			}
		case math.IsInf(onset, 1):
			seen[1]++
			if z < math.Exp(-start)-1.1 {
				t.Fatalf("%+v: onset %v, scan finds none", u, z)
			}
		default:
			seen[2]++
			if math.Abs(math.Log((1+z)/(1+onset))) > 2e-3 {
				t.Fatalf("%+v: onset %v, scan says %v", u, z, onset)
			}
			near(t, "Q at the onset", u.Q(1/(1+z))+1, 1, 1e-9)
		}
	}
	if seen[0] < 100 || seen[1] < 100 || seen[2] < 100 {
		t.Errorf("cases seen: %v", seen)
	}
}

// TestOnlyOnset: the short way for constant w finds what the way for all universes does.
func TestOnlyOnset(t *testing.T) {
	rng := rand.New(rand.NewPCG(69, 70))
	seen := [2]int{}
	for range 40000 {
		u := randomUniverse(rng)
		u.Wa = 0
		switch rng.IntN(6) {
		case 0:
			u.Om = 0
		case 1:
			u.OL = cptNoBigBang(u.Om) + 1e-3*rng.NormFloat64()
		case 2:
			u.Om, u.Or = u.Om*math.Pow(10, -12*rng.Float64()), u.Or*math.Pow(10, -12*rng.Float64())
		case 3:
			u.W0 = -1./3 - math.Pow(10, -4*rng.Float64())
		}
		e := u.expansion()
		if _, dr := e.reduced(0); !(dr > 0) || !(e.ol > 0 && e.p < 2) {
			continue
		}
		got, want := e.onlyOnset(), e.lastOnset()
		if got != u.AccelerationOnset() {
			t.Fatalf("%+v does not go the short way", u)
		}
		if math.IsInf(want, 1) || math.IsInf(got, 1) {
			seen[0]++
			if got != want {
				t.Fatalf("%+v: onset %v, want %v", u, got, want)
			}
			continue
		}
		seen[1]++
		near(t, "1+z", 1+got, 1+want, 1e-13)
		if t.Failed() {
			t.Fatalf("%+v", u)
		}
	}
	if seen[0] < 500 || seen[1] < 500 {
		t.Errorf("cases seen: %v", seen)
	}
}

// TestSecondSpell: after a bounce, at a = 0.1, these universes accelerate, decelerate for a short while around
// a = 0.53 and accelerate again. Without matter (L D/G) is least where (ba)² - 1.4ba + 0.44 = 0.
func TestSecondSpell(t *testing.T) {
	for _, om := range []float64{0, 1e-3} {
		u := Universe{Om: om, Or: 1, OL: -1.5604 - 0.4*om, H0: 70, W0: .1, Wa: .3}
		e := u.expansion()
		least, at := math.Inf(1), 0.0
		for a := 0.2; a < 1; a += 1e-5 {
			if q := -u.Q(a); q < least {
				least, at = q, a
			}
		}
		if !(least < 0 && least > -1e-3 && -u.Q(1) > 0 && e.pastZero() > 0.05) {
			t.Fatalf("Om %v: bounce at %v, least acceleration %v at %v", om, e.pastZero(), least, at)
		}
		z := u.AccelerationOnset()
		if a := 1 / (1 + z); !(a > at && a < at+0.1) || math.Abs(u.Q(a)) > 1e-12 {
			t.Errorf("Om %v: onset at a = %v with q = %v, deceleration is greatest at %v", om, a, u.Q(a), at)
		}
	}
}
