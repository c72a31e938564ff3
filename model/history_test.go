package model

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestHistoryInvertsTime: ScaleFactor(TimeAt(a)) = a on the way up, and its mirror image on the way down.
func TestHistoryInvertsTime(t *testing.T) {
	rng := rand.New(rand.NewPCG(51, 52))
	contracting := 0
	for range 400 {
		u := randomUniverse(rng)
		if !u.HasBigBang() || onBoundary(u) {
			continue
		}
		at, turn := u.Turnaround()
		for range 4 {
			a := math.Exp(-8 + 9*rng.Float64())
			if a > at {
				a = 1 + (at-1)*rng.Float64()
			}
			time := u.TimeAt(a)
			if a <= 1 {
				near(t, "time", time, u.Age(1/a-1), 1e-12)
			} else if at > 0 && turn < time {
				t.Errorf("%+v: a = %v at %v, after the turnaround at %v, %v", u, a, time, at, turn)
			}
			if rip := u.AgeToday() + u.Rip(); time > rip*(1-1e-6) {
				continue // a follows t without bound
			}
			near(t, "a", u.ScaleFactor(time), a, 1e-9)
			if crunch := u.Crunch(); crunch > 0 && a > 0.01 {
				contracting++
				near(t, "a, contracting", u.ScaleFactor(crunch-time), a, 1e-8)
			}
		}
		if t.Failed() {
			t.Fatalf("%+v", u)
		}
	}
	if contracting < 100 {
		t.Errorf("only %d points on the way down", contracting)
	}
}

// TestHistoryClosedForm: flat ΛCDM, a = (Om/OL)^(1/3) sinh^(2/3)(3√OL t/2), through several Hubble times; with
// OL < 0 the sine takes the place of sinh, through the turnaround; closed matter, a cycloid.
func TestHistoryClosedForm(t *testing.T) {
	times := make([]float64, 400)
	a := make([]float64, len(times))
	for i := range times {
		times[i] = 0.02 * float64(i)
	}
	u := lambdaCDM(.3, .7)
	u.History(times, a)
	for i, time := range times {
		near(t, "a", a[i], math.Cbrt(.3/.7)*math.Pow(math.Sinh(1.5*math.Sqrt(.7)*time), 2./3), 1e-10)
	}
	u = lambdaCDM(1.3, -.3)
	u.History(times, a)
	for i, time := range times {
		if time > u.Crunch() {
			if !math.IsNaN(a[i]) {
				t.Errorf("a = %v after the crunch", a[i])
			}
			continue
		}
		near(t, "a", a[i], math.Cbrt(1.3/.3)*math.Pow(math.Sin(1.5*math.Sqrt(.3)*time), 2./3), 1e-9)
	}
	u = lambdaCDM(2, 0)
	for _, eta := range []float64{.1, 1, 2, 3, math.Pi, 4, 6, 6.2} {
		near(t, "cycloid", u.ScaleFactor(eta-math.Sin(eta)), 1-math.Cos(eta), 1e-9)
	}
}

func TestHistoryDomain(t *testing.T) {
	u := lambdaCDM(2, 0)
	phantom := Universe{Om: .3, OL: .7, H0: HubbleTime1, W0: -1.5}
	end := phantom.AgeToday() + phantom.Rip()
	for _, c := range []struct {
		name string
		u    Universe
		t    float64
		want float64
	}{
		{"before the bang", u, -1e-9, math.NaN()}, {"bang", u, 0, 0}, {"crunch", u, u.Crunch(), 0},
		{"after the crunch", u, u.Crunch() * (1 + 1e-12), math.NaN()},
		{"today", u, u.AgeToday(), 1}, {"today again", u, u.Crunch() - u.AgeToday(), 1},
		{"rip", phantom, end, math.NaN()}, {"phantom today", phantom, phantom.AgeToday(), 1},
		{"no big bang", lambdaCDM(.3, 2), 1, math.NaN()}, {"not a number", u, math.NaN(), math.NaN()},
	} {
		got := c.u.ScaleFactor(c.t)
		if math.IsNaN(got) != math.IsNaN(c.want) || math.Abs(got-c.want) > 1e-9 {
			t.Errorf("%s: a(%v) = %v, want %v", c.name, c.t, got, c.want)
		}
	}
	if a := phantom.ScaleFactor(end * (1 - 1e-4)); !(a > 50) {
		t.Errorf("a = %v just before the rip", a)
	}
	for _, a := range []float64{0, -1, 2.0001, math.NaN()} {
		if v := u.TimeAt(a); !math.IsNaN(v) {
			t.Errorf("TimeAt(%v) = %v", a, v)
		}
	}
	defer func() {
		if recover() == nil {
			t.Error("History accepts slices of different lengths")
		}
	}()
	u.History(make([]float64, 2), make([]float64, 1))
}

// TestHistoryOrder: unordered times give what each of them gives alone.
func TestHistoryOrder(t *testing.T) {
	rng := rand.New(rand.NewPCG(53, 54))
	universes := []Universe{lambdaCDM(.3, .7), lambdaCDM(1.5, .001), lambdaCDM(2, 0),
		{Om: .3, OL: .7, Or: 1e-4, H0: HubbleTime1, W0: -1.5}, {Om: .3, OL: .8, H0: HubbleTime1, W0: -.9, Wa: -.5}}
	for len(universes) < 200 {
		if u := randomUniverse(rng); u.HasBigBang() {
			universes = append(universes, u)
		}
	}
	for _, u := range universes {
		times := make([]float64, 20)
		end := math.Min(20, u.newHistory().end)
		for i := range times {
			times[i] = end * math.Pow(rng.Float64(), 4) * (1 - 1e-5)
		}
		a := make([]float64, len(times))
		u.History(times, a)
		for i, time := range times {
			near(t, "a", a[i], u.ScaleFactor(time), 3e-9)
		}
	}
}

// TestHistorySteps: a walk in steps as short as those of a figure, and the time at every point of it.
func TestHistorySteps(t *testing.T) {
	rng := rand.New(rand.NewPCG(55, 56))
	for n := 0; n < 100; {
		u := randomUniverse(rng)
		if !u.HasBigBang() {
			continue
		}
		n++
		h := u.newHistory()
		end := math.Min(5, math.Min(h.turn, h.end)*0.99)
		times, a := make([]float64, 150), make([]float64, 150)
		for i := range times {
			times[i] = end * float64(i+1) / float64(len(times))
		}
		u.History(times, a)
		for i, time := range times {
			// The relative error of a, from that of t.
			got := u.TimeAt(a[i])
			if diff := math.Abs(got-time) * math.Sqrt(u.E2(a[i])); !(diff < 1e-9) {
				t.Fatalf("%+v: a = %v at %v, but that is reached at %v", u, a[i], time, got)
			}
		}
	}
}

// TestTimeBeforeAFarTurnaround: the time to a turnaround that is all but infinitely far says nothing of what is near.
func TestTimeBeforeAFarTurnaround(t *testing.T) {
	for _, gap := range []float64{1e-4, 1e-6, 1e-9} {
		u := Universe{Om: .3, OL: .7 + gap, H0: HubbleTime1, W0: -1.1, Wa: -.8}
		flat := u
		flat.OL = .7
		_, turn := u.Turnaround()
		if !(turn > 1e4) {
			t.Fatalf("turnaround at %v", turn)
		}
		near(t, "time", u.TimeAt(2), flat.TimeAt(2), 10*gap)
		near(t, "a", u.ScaleFactor(u.TimeAt(2)), 2, 1e-9)
	}
}

// What expands for ever grows past every number and stays there.
func TestScaleFactorOverflows(t *testing.T) {
	for _, u := range []Universe{{Om: 0.3, OL: 0.7, W0: -1}, {Om: 0.3, OL: 0.7, W0: -0.98}, {Om: 0.3, OL: 0.6, Or: 1e-4, W0: -1}} {
		u.H0 = 70
		last, ended := 0.0, false
		for _, t0 := range []float64{1, 100, 700, 850, 900, 1e3, 2e3, 1e4, 1e5, 1e9} {
			a := u.ScaleFactor(t0 * u.HubbleTime())
			if !(a >= last) || a > 1e305 && !math.IsInf(a, 1) {
				t.Errorf("%+v: a = %v at %v/H0, after %v", u, a, t0, last)
			}
			last, ended = a, math.IsInf(a, 1)
		}
		if u.W0 == -1 && !ended {
			t.Errorf("%+v: a = %v at the end", u, last)
		}
	}
}
