package model

import (
	"encoding/csv"
	"math"
	"math/rand/v2"
	"os"
	"sort"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
)

// mustPath is NewPath for redshifts that are right.
func mustPath(t *testing.T, z []float64) *Path {
	t.Helper()
	p, err := NewPath(z)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// randomRedshifts are ascending, from 1e-4 to top, with ties.
func randomRedshifts(rng *rand.Rand, n int, top float64) []float64 {
	z := make([]float64, n)
	x := make([]float64, n)
	sum := 0.0
	for i := range x {
		x[i] = rng.ExpFloat64()
		if rng.IntN(8) == 0 {
			x[i] = 0
		}
		sum += x[i]
	}
	at := 0.0
	for i := range z {
		at += x[i]
		z[i] = 1e-4 * math.Pow(top/1e-4, at/sum)
	}
	return z
}

// TestPathAgainstDistances: every element of a Path is what DM and DH give for its redshift alone, NaN for NaN.
func TestPathAgainstDistances(t *testing.T) {
	rng := rand.New(rand.NewPCG(41, 42))
	bounced := 0
	for i := range 300 {
		u := randomUniverse(rng)
		z := randomRedshifts(rng, 1+rng.IntN(60), []float64{2.3, 0.3, 1100}[i%3])
		p := mustPath(t, z)
		dm, dh := make([]float64, len(z)), make([]float64, len(z))
		p.Fill(u, dm, dh)
		for j, z := range z {
			c := u.hubbleDistance()
			wantM, wantH := u.DM(z)/c, u.DH(z)/c
			if math.IsNaN(wantM) && math.IsNaN(dm[j]) && math.IsNaN(wantH) == math.IsNaN(dh[j]) {
				bounced++
				continue
			}
			// Near the antipode the sine takes away digits of both alike.
			tol := 1e-10
			if u.Ok() < 0 {
				tol /= math.Min(1, math.Abs(math.Sqrt(-u.Ok())*wantM))
			}
			near(t, "DM", dm[j], wantM, tol)
			near(t, "DH", dh[j], wantH, 1e-12)
		}
		again := make([]float64, len(z))
		p.Fill(u, again, nil)
		for j := range again {
			if again[j] != dm[j] && !math.IsNaN(dm[j]) {
				t.Fatal("DM depends on whether DH is asked for")
			}
		}
		if t.Failed() {
			t.Fatalf("%+v", u)
		}
	}
	if bounced < 20 {
		t.Errorf("only %d redshifts beyond a bounce or an antipode", bounced)
	}
}

// TestPathNearLoitering: beside the line where E² touches zero at a = ac, DM through the dip, against a
// composite rule of 400 Gauss-Legendre panels in the variable that makes it flat: ln a - ln ac = d sinh(v), d the
// half-width of the dip.
func TestPathNearLoitering(t *testing.T) {
	for _, om := range []float64{.05, .2, .3, .45, .8, 1.2} {
		for _, gap := range []float64{1e-2, 1e-4, 1e-6} {
			u := lambdaCDM(om, cptNoBigBang(om)-gap)
			ac := math.Cbrt(om / (2 * cptNoBigBang(om)))
			for _, far := range []float64{1, 2.5, 20} {
				z := []float64{0.5 * (1/ac - 1), 1/ac - 1, far * (1/ac - 1)}
				if far == 1 {
					z = z[:2]
				}
				p := mustPath(t, z)
				dm := make([]float64, len(z))
				p.Fill(u, dm, nil)
				k := math.Sqrt(-u.Ok())
				for i, z := range z {
					chi := peakedIntegral(u, z, math.Log(ac), math.Sqrt(gap))
					want := math.Sin(k*chi) / k
					if k*chi > math.Pi {
						want = math.NaN()
					}
					if math.IsNaN(want) && math.IsNaN(dm[i]) {
						continue
					}
					// The rounding of the parameters is amplified by 1e-16/E² at the dip, and by the sine.
					tol := (1e-11 + 2e-15/gap) * math.Max(1, math.Abs(k*chi/math.Tan(k*chi)))
					near(t, "DM", dm[i], want, tol)
				}
			}
		}
	}
}

// peakedIntegral is the comoving distance in c/H0 with nodes crowded around ln a = c within d.
func peakedIntegral(u Universe, z, c, d float64) float64 {
	lo, hi := math.Asinh((-math.Log1p(z)-c)/d), math.Asinh(-c/d)
	const panels = 400
	sum := 0.0
	for i := range panels {
		f := func(v float64) float64 {
			s := c + d*math.Sinh(v)
			return d * math.Cosh(v) * math.Exp(-s) / math.Sqrt(u.E2(math.Exp(s)))
		}
		w := (hi - lo) / panels
		sum += quad.Fixed(f, lo+w*float64(i), lo+w*float64(i+1), 8, quad.Legendre{}, 1)
	}
	return sum
}

// TestPathDomain: NaN from the bounce on, and past the antipode, and not before.
func TestPathDomain(t *testing.T) {
	u := lambdaCDM(.3, 2)
	e := u.expansion()
	bounce := 1/e.pastZero() - 1
	z := []float64{.1, .5 * bounce, bounce * (1 - 1e-9), bounce * (1 + 1e-9), 2 * bounce, 1000}
	dm, dh := make([]float64, 6), make([]float64, 6)
	mustPath(t, z).Fill(u, dm, dh)
	for i := range z {
		if beyond := i > 2; math.IsNaN(dh[i]) != beyond || beyond != math.IsNaN(dm[i]) ||
			beyond != math.IsNaN(u.DC(z[i])) || beyond != math.IsNaN(u.Lookback(z[i])) || beyond != math.IsNaN(u.DH(z[i])) {
			t.Errorf("z %v, bounce at %v: DM %v DH %v DC %v", z[i], bounce, dm[i], dh[i], u.DC(z[i]))
		}
	}
	// Closed, lingering: the antipode is passed though the expansion goes on.
	u = lambdaCDM(.3, cptNoBigBang(.3)-1e-4)
	z = []float64{1, 1000}
	mustPath(t, z).Fill(u, dm[:2], dh[:2])
	if math.IsNaN(dm[0]) || !math.IsNaN(dm[1]) || math.IsNaN(dh[1]) || !math.IsNaN(u.DL(1000)) || math.IsNaN(u.DC(1000)) {
		t.Errorf("DM %v DH %v DL %v", dm[:2], dh[:2], u.DL(1000))
	}
	// Outside the domain of the functions of one redshift.
	u = lambdaCDM(.3, .7)
	for _, z := range []float64{-0.1, -2, math.NaN()} {
		for name, v := range map[string]float64{"DC": u.DC(z), "DM": u.DM(z), "DH": u.DH(z), "DV": u.DV(z),
			"lookback": u.Lookback(z), "age": u.Age(z), "mu": u.DistanceModulus(z, z)} {
			if !math.IsNaN(v) {
				t.Errorf("%s(%v) = %v", name, z, v)
			}
		}
	}
	if !math.IsNaN(u.E2(0)) || !math.IsNaN(u.E2(-1)) || !math.IsNaN(u.E(-2)) || !math.IsNaN(u.Q(0)) ||
		!math.IsNaN(lambdaCDM(.3, 2).E(2)) || u.DC(0) != 0 || u.Lookback(0) != 0 {
		t.Error("a function returns a number outside its domain")
	}
}

func TestPathErrors(t *testing.T) {
	for _, c := range []struct {
		z    []float64
		want string
	}{
		{nil, "at least one"}, {[]float64{0}, "positive"}, {[]float64{-1}, "positive"}, {[]float64{math.NaN()}, "positive"},
		{[]float64{1, math.Inf(1)}, "redshift 1"}, {[]float64{1, .5}, "0.5 follows 1"},
	} {
		if _, err := NewPath(c.z); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v: error %v, want one about %q", c.z, err, c.want)
		}
	}
	defer func() {
		if recover() == nil {
			t.Error("Fill accepts slices of the wrong length")
		}
	}()
	mustPath(t, []float64{1}).Fill(lambdaCDM(.3, .7), make([]float64, 2), nil)
}

func TestPathDoesNotAllocate(t *testing.T) {
	p := mustPath(t, benchRedshifts(200))
	dm, dh := make([]float64, 200), make([]float64, 200)
	for _, c := range benchCases {
		if n := testing.AllocsPerRun(10, func() { p.Fill(c.u, dm, dh) }); n > 0 {
			t.Errorf("%s: %v allocations", c.name, n)
		}
	}
}

// TestPathWork: the universes that are hardest to integrate must not take for ever: rounding noise beside a
// double zero of E² looks like structure to a rule that halves its panels.
func TestPathWork(t *testing.T) {
	dm := make([]float64, 100)
	p := mustPath(t, randomRedshifts(rand.New(rand.NewPCG(45, 46)), 100, 1100))
	for _, gap := range []float64{1e-8, 1e-10, 1e-12, 1e-14, 1e-15, 0, -1e-15, -1e-14, -1e-12, -1e-10} {
		u := lambdaCDM(.3, cptNoBigBang(.3)-gap)
		for _, w := range []float64{-1, -1 + 1e-15} {
			u.W0 = w
			e := u.expansion()
			end := math.Min(7, e.reach()*(1-1e-15))
			budget := panelBudget
			whole.bisect(e.comovingRate, 0, end, integralTail, maxDepth, &budget)
			d := descent{p, &e, dm, panelBudget}
			d.refine(0, end, 0, 0, sort.SearchFloat64s(p.y, end), maxDepth)
			if used := 2*panelBudget - budget - d.budget; used > 400 {
				t.Errorf("OL %v from the boundary, w %v: %d panels", -gap, w, used)
			}
		}
	}
}

// TestSinc: the series joins sinh and sin, and is what they are where both can be evaluated.
func TestSinc(t *testing.T) {
	for _, u := range []float64{-1, -.5, -1e-3, 1e-3, .5, 1} {
		r := math.Sqrt(math.Abs(u))
		want := math.Sinh(r) / r
		if u < 0 {
			want = math.Sin(r) / r
		}
		near(t, "sinc", sinc(u), want, 4e-16)
		near(t, "sinc above the join", sinc(math.Nextafter(u, math.Copysign(2, u))), want, 4e-16)
	}
	if sinc(0) != 1 || !math.IsNaN(sinc(-9.8697)) || math.IsNaN(sinc(-9.8696)) {
		t.Error("sinc at its special points")
	}
}

// TestPrecise compares with 40-digit arithmetic: ../testdata/universes says how it was made. Half of the
// universes are beside the line where E² touches zero.
func TestPrecise(t *testing.T) {
	f, err := os.Open("../testdata/universes/precise.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	worst := map[string]float64{}
	for i, row := range rows[1:] {
		v := make([]float64, len(row))
		for j := range v {
			v[j] = math.NaN()
			if row[j] != "" {
				if v[j], err = strconv.ParseFloat(row[j], 64); err != nil {
					t.Fatal(err)
				}
			}
		}
		u := Universe{Om: v[0], OL: v[1], Or: v[2], W0: v[3], Wa: v[4], H0: HubbleTime1}
		z := v[5]
		var dm [1]float64
		mustPath(t, []float64{z}).Fill(u, dm[:], nil)
		a, turn := u.Turnaround()
		c := u.hubbleDistance()
		// The rounding of the parameters, amplified where E² nearly vanishes and by the sine near the antipode.
		least := math.Inf(1)
		for s := -math.Log1p(z); s < 0; s += 1e-3 {
			r, _ := (&expansion{u.Or, u.Om, u.Ok(), u.OL, 3 * (1 + u.W0 + u.Wa), 3 * u.Wa, false}).reduced(s)
			least = math.Min(least, r)
		}
		tol := 3e-11 + 1e-15/least
		sine := 1.0
		if u.Ok() < 0 {
			k := math.Sqrt(-u.Ok())
			sine = math.Max(1, math.Abs(k*v[6]/math.Tan(k*v[6])))
		}
		for _, c := range []struct {
			name           string
			got, want, tol float64
		}{
			{"DC", u.DC(z) / c, v[6], tol}, {"DM", u.DM(z) / c, v[7], tol * sine}, {"Path", dm[0], v[7], tol * sine},
			{"lookback", u.Lookback(z), v[8], tol}, {"age", u.Age(z), v[9], tol},
			{"turnaround a", a, v[10], 1e-12}, {"turnaround t", turn, v[11], tol}, {"rip", u.Rip(), v[12], tol},
		} {
			if math.IsNaN(c.got) && math.IsNaN(c.want) {
				continue
			}
			diff := math.Abs(c.got/c.want-1) / c.tol
			worst[c.name] = math.Max(worst[c.name], diff)
			if !(diff <= 1) {
				t.Errorf("row %d %+v z %v: %s = %.16g, want %.16g (relative %.1e, allowed %.1e)",
					i+1, u, z, c.name, c.got, c.want, math.Abs(c.got/c.want-1), c.tol)
			}
		}
	}
	t.Logf("%d universes; worst differences in units of what is allowed: %v", len(rows)-1, worst)
}
