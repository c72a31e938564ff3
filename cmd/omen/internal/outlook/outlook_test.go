package outlook

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"omen/likelihood"
	"omen/model"
	"omen/sampler"
)

func randomUniverse(r *rand.Rand, energy likelihood.DarkEnergy) model.Universe {
	u := model.Universe{Om: 2 * r.Float64(), OL: 3*r.Float64() - 1, H0: 50 + 40*r.Float64(), W0: -1}
	if energy >= likelihood.W {
		u.W0 = -3 + 3*r.Float64()
	}
	if energy == likelihood.W0Wa {
		u.Wa = 4*r.Float64() - 2
	}
	return u
}

// A code brings its label back, and every label that occurs is a possible one.
func TestLabels(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for _, energy := range []likelihood.DarkEnergy{likelihood.Constant, likelihood.W, likelihood.W0Wa} {
		for _, flat := range []bool{false, true} {
			f := likelihood.Family{DarkEnergy: energy, Flat: flat, RequireBigBang: true}
			seen := map[string]bool{}
			for range 3000 {
				u := randomUniverse(r, energy)
				if flat {
					u.OL = 1 - u.Om
				}
				l := LabelOf(u)
				if got := Decode(l.Code()); got != l {
					t.Fatalf("%+v became %+v", l, got)
				}
				if !u.HasBigBang() {
					continue
				}
				if !Possible(f, func(x Label) bool { return x == l }) {
					t.Fatalf("%+v: %+v is said to be impossible", u, l)
				}
				seen[l.Fate.String()] = true
			}
			for _, s := range Fates() {
				if Possible(f, s.Holds) != seen[s.Name] {
					t.Errorf("%v, flat %v: %s is possible: %v, seen: %v", energy, flat, s.Name, !seen[s.Name], seen[s.Name])
				}
			}
		}
	}
}

// Exactly one fate is true of a universe, and exactly one geometry.
func TestStatements(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	count := func(list []Statement, l Label) (n int) {
		for _, s := range list {
			if s.Holds(l) {
				n++
			}
		}
		return n
	}
	for range 2000 {
		l := LabelOf(randomUniverse(r, likelihood.W0Wa))
		if count(Fates(), l) != 1 || count(HeldFates(), l) != 1 || count(Today()[1:], l) != 1 {
			t.Fatalf("%+v: %d fates, %d held, %d geometries", l, count(Fates(), l), count(HeldFates(), l), count(Today()[1:], l))
		}
	}
}

// The moments are those of package model, from today, in either unit; what does not
// come to be is NaN.
func TestEvents(t *testing.T) {
	at := func(name string, u model.Universe, gyr bool) float64 {
		for _, e := range Events(true) {
			if e.Name == name {
				return e.At(u, gyr)
			}
		}
		t.Fatalf("no event %s", name)
		return 0
	}
	closed := model.Universe{Om: 2, H0: 70, W0: -1}
	crunch := 2 * math.Pi // since the big bang, in 1/H0: πΩ/(Ω-1)^1.5
	age := math.Pi/2 - 1
	for _, gyr := range []bool{false, true} {
		unit := 1.0
		if gyr {
			unit = closed.HubbleTime()
		}
		for name, want := range map[string]float64{"turnaround": crunch/2 - age, "crunch": crunch - age} {
			if got := at(name, closed, gyr); math.Abs(got/unit-want) > 1e-9 {
				t.Errorf("%s at %v, want %v", name, got/unit, want)
			}
		}
	}
	if !math.IsNaN(at("rip", closed, true)) || !math.IsNaN(at("acceleration_onset", closed, true)) {
		t.Error("a closed universe of matter rips or accelerates")
	}
	u := model.Universe{Om: 0.3, OL: 0.7, W0: -1.1, Wa: -0.3, H0: 70}
	if rip, held := at("rip", u, true), at("rip_w_held", u, true); !math.IsNaN(rip) || !(held > 100 && held < 120) {
		t.Errorf("rip at %v, with w held at %v", rip, held) // 110.4 Gyr for w = -1.1, h = 0.7
	}
	if z := at("acceleration_onset_z", model.Universe{Om: 0.3, OL: 0.7, W0: -1, H0: 70}, true); math.Abs(z-(math.Cbrt(14./3)-1)) > 1e-9 {
		t.Errorf("acceleration began at z = %v", z)
	}
}

// Traces go through turnaround and crunch, are today what they are today, and their
// bands are quantiles.
func TestTraces(t *testing.T) {
	best := model.Universe{Om: 2, H0: 70, W0: -1}
	var sample []model.Universe
	for i := range 101 {
		sample = append(sample, model.Universe{Om: 1.9 + 0.002*float64(i), H0: 70, W0: -1})
	}
	tr := Traces(best, sample, false, 0)
	n := len(tr.Time)
	today, found := slices.BinarySearch(tr.Time, 0)
	if !found || math.Abs(tr.Best[today]-1) > 1e-9 || math.Abs(tr.Low95[today]-1) > 1e-9 || math.Abs(tr.High95[today]-1) > 1e-9 {
		t.Fatalf("today is not among the times, or not 1")
	}
	age := math.Pi/2 - 1
	var turned, ended, begun bool
	for i, time := range tr.Time {
		turned = turned || math.Abs(time-(math.Pi-age)) < 1e-9 && math.Abs(tr.Best[i]-2) < 1e-9
		ended = ended || math.Abs(time-(2*math.Pi-age)) < 1e-9 && tr.Best[i] == 0
		begun = begun || math.Abs(time+age) < 1e-9 && tr.Best[i] == 0
		if !(tr.Low95[i] <= tr.Low68[i] && tr.Low68[i] <= tr.Median[i] && tr.Median[i] <= tr.High68[i] && tr.High68[i] <= tr.High95[i]) {
			t.Fatalf("bands cross at %v", time)
		}
	}
	if !turned || !ended || !begun {
		t.Errorf("big bang %v, turnaround %v, crunch %v are among the times", begun, turned, ended)
	}
	if !math.IsNaN(tr.Best[0]) || !math.IsNaN(tr.Best[n-1]) || tr.Median[n-1] != 0 {
		t.Errorf("before the bang %v, after the crunch %v, median %v", tr.Best[0], tr.Best[n-1], tr.Median[n-1])
	}
	if again := Traces(best, sample, true, 1.5); math.Abs(again.Time[len(again.Time)-1]-1.5*best.HubbleTime()) > 1e-6 {
		t.Errorf("asked for 1.5/H0 ahead, got %v Gyr", again.Time[len(again.Time)-1])
	}
	if Traces(model.Universe{Om: 0.1, OL: 1.5, W0: -1, H0: 70}, nil, true, 0) != nil {
		t.Error("a history without a big bang")
	}
}

// What was torn apart is beyond all.
func TestTraceOfARip(t *testing.T) {
	u := model.Universe{Om: 0.3, OL: 0.7, W0: -1.5, H0: 70}
	tr := Traces(u, []model.Universe{u, u, u}, true, 0)
	n := len(tr.Time)
	if rip := u.Rip(); !(tr.Time[n-1] > rip && math.IsInf(tr.Median[n-1], 1) && math.IsNaN(tr.Best[n-1])) {
		t.Errorf("the rip is at %v; at %v the median is %v, the best fit %v", rip, tr.Time[n-1], tr.Median[n-1], tr.Best[n-1])
	}
}

// Even points: each eighth of a box has its share.
func TestSpread(t *testing.T) {
	p, err := likelihood.Flat(0, 2)
	if err != nil {
		t.Fatal(err)
	}
	space, err := likelihood.NewSpace(likelihood.Family{Free: []likelihood.Parameter{{Name: "Om", Prior: p}, {Name: "OL", Prior: p}, {Name: "H0", Prior: p}}})
	if err != nil {
		t.Fatal(err)
	}
	var count [8]int
	Spread(space, 8000, func(x []float64) {
		i := 0
		for _, v := range x {
			i *= 2
			if v > 1 {
				i++
			}
		}
		count[i]++
	})
	for i, n := range count {
		if n < 955 || n > 1045 {
			t.Errorf("%d of 8000 points in eighth %d", n, i)
		}
	}
}

// One draw in a thousand is no measurement of a probability; ten are.
func TestFewDrawsAreALimit(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for _, c := range []struct {
		p     float64
		limit bool
	}{{0.0005, true}, {0.02, false}, {0.9995, true}, {0.98, false}} {
		codes := make([]float64, 4000)
		for n, i := range rng.Perm(len(codes)) {
			u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
			if float64(n)+0.5 > c.p*4000 {
				u.OL = -0.1
			}
			codes[i] = LabelOf(u).Code()
		}
		d := Drawn{Codes: sampler.NewDraws(1, codes), ESS: 4000}
		s := d.Probability(func(l Label) bool { return l.Accelerating })
		if got := !math.IsNaN(s.Upper) || !math.IsNaN(s.Lower); got != c.limit {
			t.Errorf("about %v: %+v", c.p, s)
		}
		if !math.IsNaN(s.Upper) && !(s.P == 0 && s.Upper > 0.0007 && s.Upper < 0.003) {
			t.Errorf("about %v: %+v", c.p, s)
		}
	}
	// A sample that alternates in two long halves is worth next to nothing either way.
	codes := make([]float64, 40)
	for i := range codes {
		u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
		if i >= 20 {
			u.OL = -0.1
		}
		codes[i] = LabelOf(u).Code()
	}
	s := Drawn{Codes: sampler.NewDraws(1, codes), ESS: 2}.Probability(func(l Label) bool { return l.Accelerating })
	if s.P != 0.5 || !(s.Err > 0.25) || !math.IsNaN(s.Upper) || !math.IsNaN(s.Lower) {
		t.Errorf("two draws: %+v", s)
	}
}
