package model

import (
	"math"
	"math/rand/v2"
	"testing"
)

// boundaries of Carroll, Press & Turner 1992 in the (Om, OL) plane: below the first a universe recollapses,
// from the second on it had no big bang. Recomputed to the digits given.
var boundaries = []struct{ om, recollapse, noBigBang float64 }{
	{.1, 0, 1.35}, {.2, 0, 1.5476099904}, {.3, 0, 1.7134604029}, {.5, 0, 2}, {.8, 0, 2.3720455151},
	{1, 0, 2.5980762114}, {1.2, .00083337680, 2.8124195531}, {1.5, .00866585603, 3.1178039866},
	{2, .0418890660, 3.5962666587}, {2.5, .0964445594, 4.0481171043}, {3, .1676588673, 4.4809535293},
	{5, .5629984151, 6.0932445917}, {10, 1.9394891349, 9.7221070174},
}

// cptRecollapse and cptNoBigBang are those boundaries as Carroll, Press & Turner print them.
func cptRecollapse(om float64) float64 {
	if om <= 1 {
		return 0
	}
	return 4 * om * math.Pow(math.Cos(math.Acos((1-om)/om)/3+4*math.Pi/3), 3)
}

func cptNoBigBang(om float64) float64 {
	if om < 0.5 {
		return 4 * om * math.Pow(math.Cosh(math.Acosh((1-om)/om)/3), 3)
	}
	return 4 * om * math.Pow(math.Cos(math.Acos((1-om)/om)/3), 3)
}

// bisectOL finds where, between lo and hi, a property of the universe changes with OL.
func bisectOL(om, lo, hi float64, below func(Universe) bool) float64 {
	for range 100 {
		mid := (lo + hi) / 2
		if below(lambdaCDM(om, mid)) {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2
}

func TestBoundaries(t *testing.T) {
	for _, b := range boundaries {
		got := bisectOL(b.om, -0.4, b.noBigBang-1e-3, func(u Universe) bool { return u.Fate() == Recollapse })
		if math.Abs(got-b.recollapse) > 6e-11 || math.Abs(cptRecollapse(b.om)-b.recollapse) > 6e-11 {
			t.Errorf("Om %v recollapses below OL = %.10f, formula %.10f, want %.10f",
				b.om, got, cptRecollapse(b.om), b.recollapse)
		}
		got = bisectOL(b.om, b.noBigBang/2+0.5, b.noBigBang+1, Universe.HasBigBang)
		if math.Abs(got-b.noBigBang) > 6e-11 || math.Abs(cptNoBigBang(b.om)-b.noBigBang) > 6e-11 {
			t.Errorf("Om %v: no big bang from OL = %.10f, formula %.10f, want %.10f",
				b.om, got, cptNoBigBang(b.om), b.noBigBang)
		}
		const e = 1e-9
		for _, c := range []struct {
			ol   float64
			want Fate
		}{
			{b.recollapse - e, Recollapse}, {b.recollapse + e, Accelerating},
			{b.noBigBang - e, Accelerating}, {b.noBigBang + e, NoBigBang},
		} {
			if got := lambdaCDM(b.om, c.ol).Fate(); got != c.want {
				t.Errorf("Om %v OL %v: %v, want %v", b.om, c.ol, got, c.want)
			}
			// The general search must draw the same line as the discriminant: w a hair from -1.
			u := lambdaCDM(b.om, c.ol)
			u.W0 = -1 + 1e-15
			if got := u.Fate(); got != c.want {
				t.Errorf("Om %v OL %v w = -1+1e-15: %v, want %v", b.om, c.ol, got, c.want)
			}
		}
	}
}

// TestBoundariesOfHeavyUniverses: far up in Om the two lines close in on each other, and on today.
func TestBoundariesOfHeavyUniverses(t *testing.T) {
	for _, om := range []float64{30, 100, 1000} {
		for _, c := range []struct {
			ol   float64
			want Fate
		}{
			{cptRecollapse(om) - 1e-6*om, Recollapse}, {cptRecollapse(om) + 1e-6*om, Accelerating},
			{cptNoBigBang(om) - 1e-6*om, Accelerating}, {cptNoBigBang(om) + 1e-6*om, NoBigBang},
		} {
			if got := lambdaCDM(om, c.ol).Fate(); got != c.want {
				t.Errorf("Om %v OL %v: %v, want %v", om, c.ol, got, c.want)
			}
		}
		if got := lambdaCDM(om, cptNoBigBang(om)+1e-6*om).Future(); got != Accelerating {
			t.Errorf("Om %v: a bounce in the past leads to %v", om, got)
		}
	}
}

// TestFate: one universe and more of every kind, with the reason in the name.
func TestFate(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct {
		name string
		u    Universe
		want Fate
	}{
		{"ours", Universe{Om: .3, OL: .7, W0: -1}, Accelerating},
		{"closed matter", Universe{Om: 1.1, W0: -1}, Recollapse},
		{"open matter", Universe{Om: .3, W0: -1}, Decelerating},
		{"open matter and radiation", Universe{Om: .3, Or: 1e-4, W0: -1}, Decelerating},
		{"Einstein-de Sitter", Universe{Om: 1, W0: -1}, Critical},
		{"flat matter and radiation", Universe{Om: 1 - 9e-5, Or: 9e-5, W0: -1}, Critical},
		{"flat, rounding in 1-Om-Or", Universe{Om: 1 - .1e-4*3, Or: .1e-4 * 3, W0: -1}, Critical},
		{"empty", Universe{W0: -1}, Coasting},
		{"de Sitter had no beginning", Universe{OL: 1, W0: -1}, NoBigBang},
		{"empty with a constant", Universe{OL: .5, W0: -1}, Accelerating},
		{"any negative constant recollapses", Universe{Om: .1, OL: -1e-6, W0: -1}, Recollapse},
		{"loitering line, a = 1.5 ahead, exact in binary", Universe{Om: 6.75, OL: 1, W0: -1}, Decelerating},
		{"loitering line, a = 0.5 behind, exact in binary", Universe{Om: .5, OL: 2, W0: -1}, NoBigBang},
		{"bounce", Universe{Om: .1, OL: 1.5, W0: -1}, NoBigBang},
		{"radiation only, closed", Universe{Or: 1.2, W0: -1}, Recollapse},
		{"phantom", Universe{Om: .3, OL: .7, W0: -1.01}, BigRip},
		{"quintessence", Universe{Om: .3, OL: .7, W0: -.5}, Accelerating},
		{"too stiff to accelerate", Universe{Om: .3, OL: .7, W0: -.3}, Decelerating},
		{"string-like, flat", Universe{Om: .3, OL: .7, W0: -1. / 3}, Decelerating},
		{"dark energy like matter", Universe{Om: .3, OL: .7, W0: 0}, Decelerating},
		{"negative, like matter, open: curvature wins", Universe{Om: .8, OL: -.2, W0: 0}, Decelerating},
		{"negative, w -0.2, open: curvature wins", Universe{Om: .8, OL: -.2, W0: -.2}, Decelerating},
		{"negative, w -0.5, open: dark energy wins", Universe{Om: .8, OL: -.2, W0: -.5}, Recollapse},
		{"negative phantom", Universe{Om: .8, OL: -.2, W0: -2}, Recollapse},
		{"closed, w -0.3: curvature wins", Universe{Om: .5, OL: .8, W0: -.3}, Recollapse},
		{"closed phantom turns before it could rip", Universe{Om: 3, OL: .01, W0: -1.2}, Recollapse},
		{"negative stiff dark energy in the past", Universe{Om: .8, OL: -.2, W0: .1}, NoBigBang},
		{"negative, like radiation in the past", Universe{Om: .8, OL: -.2, Or: 1e-3, W0: 1. / 3}, NoBigBang},
		{"grows though w0 > -1", Universe{Om: .3, OL: .7, W0: -.9, Wa: .2}, BigRip},
		{"dies though w0 < -1, flat", Universe{Om: .3, OL: .7, W0: -1.5, Wa: -.2}, Decelerating},
		{"dies though w0 < -1, open", Universe{Om: .3, OL: .6, W0: -1.5, Wa: -.2}, Decelerating},
		{"dies though w0 < -1, closed", Universe{Om: .3, OL: .8, W0: -1.5, Wa: -.2}, Recollapse},
		{"flat by subtraction, dies", Universe{Om: .3, OL: 1 - .3 - 8.5e-5, Or: 8.5e-5, W0: -.9, Wa: -.6}, Decelerating},
		{"flat by subtraction, dies", Universe{Om: .31, OL: 1 - .31 - 9.1e-5, Or: 9.1e-5, W0: -.9, Wa: -.6}, Decelerating},
		{"negative and growing", Universe{Om: 1.2, OL: -.1, W0: -.9, Wa: .2}, Recollapse},
		{"like curvature, and outweighs it", Universe{Om: .5, OL: .8, W0: -1. / 3}, Decelerating},
		{"negative, but less than the matter that it once was like", Universe{Om: .5, OL: -.3, W0: -.5, Wa: .5}, Recollapse},
		{"negative, and more than that matter", Universe{Om: .5, OL: -.3, W0: .5, Wa: -.5}, NoBigBang},
		{"negative and dying, open", Universe{Om: .8, OL: -.1, W0: -.9, Wa: -.2}, Decelerating},
		{"not a number", Universe{Om: nan, OL: .7, W0: -1}, Unknown},
		{"infinite", Universe{Om: .3, OL: math.Inf(1), W0: -1}, Unknown},
		{"not a number", Universe{Om: .3, OL: .7, W0: nan}, Unknown},
		{"not a number", Universe{Om: .3, OL: .7, W0: -1, Wa: nan}, Unknown},
	} {
		if got := c.u.Fate(); got != c.want {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
		if c.want == Unknown && c.u.HasBigBang() {
			t.Errorf("%s: has a big bang", c.name)
		}
	}
}

func TestFrozen(t *testing.T) {
	u := Universe{Om: .3, OL: .7, H0: 70, W0: -.9, Wa: .2}
	if got := u.Frozen().Fate(); got != Accelerating {
		t.Errorf("w held at -0.9: %v", got)
	}
	if got := u.Frozen(); got != (Universe{Om: .3, OL: .7, H0: 70, W0: -.9}) {
		t.Errorf("frozen %+v", got)
	}
}

func TestFateNames(t *testing.T) {
	seen := map[string]bool{}
	for _, f := range Fates() {
		if f == Unknown || f.String() == Unknown.String() || seen[f.String()] {
			t.Errorf("fate %d is called %q", f, f)
		}
		seen[f.String()] = true
	}
	if len(seen) != len(fateNames)-1 || Fate(200).String() != "unknown" {
		t.Errorf("%d fates, want %d", len(seen), len(fateNames)-1)
	}
}

// TestFuture: what the end is does not depend on the beginning, and the times of the end agree with it.
func TestFuture(t *testing.T) {
	rng := rand.New(rand.NewPCG(21, 22))
	for range 3000 {
		u := randomUniverse(rng)
		if u.OL < 0 && u.Wa == 0 && math.Abs(u.W0+1./3) < 0.01 {
			continue // may turn at an a beyond the numbers
		}
		future, fate := u.Future(), u.Fate()
		if fate != future && fate != NoBigBang || (fate == NoBigBang) == u.HasBigBang() {
			t.Fatalf("%+v: fate %v, future %v, big bang %v", u, fate, future, u.HasBigBang())
		}
		a, turn := u.Turnaround()
		turns := fate == Recollapse
		if (future == Recollapse) != (a > 1) || turns != (turn > 0) || turns != (u.Crunch() > 0) {
			t.Fatalf("%+v: fate %v but turnaround at %v, %v", u, fate, a, turn)
		}
		if (future == BigRip) != (u.Rip() > 0) {
			t.Fatalf("%+v: future %v but rip in %v", u, future, u.Rip())
		}
		if (fate == NoBigBang) != math.IsNaN(u.AgeToday()) {
			t.Fatalf("%+v: fate %v but age %v", u, fate, u.AgeToday())
		}
	}
}
