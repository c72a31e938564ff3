package sampler

import (
	"math"
	"testing"
)

func indicator(d Draws, yes func(x float64) bool) Draws {
	return d.Map(func(x float64) float64 {
		if yes(x) {
			return 1
		}
		return 0
	})
}

func TestProportion(t *testing.T) {
	d := NewDraws(4, normals(1, 10000), normals(2, 10000))
	s := Proportion(indicator(d, func(x float64) bool { return x > 1 }), 500)
	near(t, "P", s.P, 0.158655, 4*s.Error)
	near(t, "error", s.Error, math.Sqrt(0.1587*0.8413/20000), 0.15*s.Error)
	near(t, "ESS", s.ESS, 20000, 3000)
	// One-sided 95% is 1.645 errors.
	near(t, "lower limit", s.Lower95, s.P-1.645*s.Error, 0.1*s.Error)
	near(t, "upper limit", s.Upper95, s.P+1.645*s.Error, 0.1*s.Error)
}

func TestProportionNeverSeen(t *testing.T) {
	d := NewDraws(4, normals(1, 10000), normals(2, 10000))
	never := Proportion(indicator(d, func(x float64) bool { return x > 100 }), 600)
	if never.P != 0 || !math.IsNaN(never.Error) || never.ESS != 600 || never.Lower95 != 0 || never.Upper95 != 0.005 {
		t.Errorf("never seen: %+v, want 0, error NaN, limit 3/600", never)
	}
	always := Proportion(indicator(d, func(x float64) bool { return x < 100 }), 600)
	if always.P != 1 || !math.IsNaN(always.Error) || always.Lower95 != 0.995 || always.Upper95 != 1 {
		t.Errorf("always seen: %+v, want 1, error NaN, limit 1 − 3/600", always)
	}
	if s := Proportion(indicator(d, func(x float64) bool { return x > 100 }), math.NaN()); !math.IsNaN(s.Upper95) {
		t.Errorf("never seen with unknown ESS: limit %v, want NaN", s.Upper95)
	}
	if s := Proportion(indicator(d, func(x float64) bool { return x > 100 }), 2); s.Upper95 != 1 {
		t.Errorf("never seen in 2: limit %v, want 1", s.Upper95)
	}
}

func TestProportionOfOtherNumbersPanics(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("no panic for a draw of 0.5")
		}
	}()
	Proportion(NewDraws(1, []float64{0, 0.5}), 1)
}
