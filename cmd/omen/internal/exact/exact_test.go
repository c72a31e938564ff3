package exact

import (
	"context"
	"errors"
	"math"
	"testing"

	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/job/jobtest"
	"omen/cmd/omen/internal/outlook"
	"omen/data"
	"omen/likelihood"
	"omen/model"
	"omen/sampler/quadrature"

	"gonum.org/v1/gonum/integrate/quad"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

func integrate(t *testing.T, j *job.Job) *Posterior {
	t.Helper()
	e, err := Integrate(context.Background(), j.Posterior, nil, 0)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func closed(l outlook.Label) bool { return l.Curvature < 0 }

// grid sums the density over an even grid of (Om, Ok, hrd), on which Ok = 0 is a line of nodes, and returns ln of
// the integral and the probability of a closed universe. The trapezoidal sum of a smooth function that
// vanishes at the ends converges faster than any power of the step; a border counts by Simpson's rule along Ok.
func grid(j *job.Job, om, ok, hrd [3]float64) (logZ, pClosed float64) {
	density := j.Posterior.Evaluator().LogDensity
	n := func(r [3]float64) int { return int(math.Round((r[1] - r[0]) / r[2])) }
	peak := math.Inf(-1)
	rows := make([]float64, n(ok)+1) // ∫ dOm dhrd at each Ok, in units of exp(peak)
	for pass := range 2 {
		for i := range rows {
			o := ok[0] + float64(i)*ok[2]
			for a := range n(om) + 1 {
				m := om[0] + float64(a)*om[2]
				for h := range n(hrd) + 1 {
					lp := density([]float64{m, 1 - m - o, hrd[0] + float64(h)*hrd[2]})
					if pass == 0 {
						peak = math.Max(peak, lp)
					} else {
						rows[i] += math.Exp(lp - peak)
					}
				}
			}
		}
	}
	zero := int(math.Round(-ok[0] / ok[2]))
	all := simpson(rows)
	below := simpson(rows[:zero+1])
	return peak + math.Log(all*ok[2]*om[2]*hrd[2]), below / all
}

// simpson sums over an even number of intervals, in units of the step.
func simpson(y []float64) float64 {
	if len(y)%2 == 0 {
		panic("odd number of intervals")
	}
	sum := 0.0
	for i, v := range y {
		w := 4.0
		if i%2 == 0 {
			w = 2
		}
		if i == 0 || i == len(y)-1 {
			w = 1
		}
		sum += w * v / 3
	}
	return sum
}

// The curved runs against a sum over a fine grid.
func TestCurvedRunsAgainstGrid(t *testing.T) {
	for _, c := range []struct {
		name        string
		om, ok, hrd [3]float64
	}{
		{"fate.toml", [3]float64{0.22, 0.37, 0.0025}, [3]float64{-0.24, 0.336, 0.006}, [3]float64{95.5, 106, 0.25}},
		{"bao.toml", [3]float64{0.21, 0.38, 0.0025}, [3]float64{-0.3, 0.36, 0.006}, [3]float64{94, 109, 0.3}},
	} {
		j := jobtest.Committed(t, c.name)
		e := integrate(t, j)
		logZ, want := grid(j, c.om, c.ok, c.hrd)
		got := e.Probability(closed)
		t.Logf("%s: ln Z %.7f, grid %.7f; P(closed) %.6f ± %.1g, grid %.6f", c.name, e.LogEvidence.Value, logZ, got.P, got.Err, want)
		if d := math.Abs(e.LogEvidence.Value - logZ); !(d < 1e-4) {
			t.Errorf("%s: ln evidence differs from the grid by %.2g", c.name, d)
		}
		if d := math.Abs(got.P - want); !(d < 1e-4) {
			t.Errorf("%s: P(closed) %.6f, grid %.6f", c.name, got.P, want)
		}
		if d := j.Posterior.Evaluator().LogDensity(e.Best) - e.LogBest; !(math.Abs(d) < 1e-9) {
			t.Errorf("%s: the density at the best point is off by %g", c.name, d)
		}
	}
}

// Labels that have no class of their own are found at the nodes.
func TestLabelsWithoutClass(t *testing.T) {
	j := jobtest.Committed(t, "supernovae.toml")
	want := integrate(t, j).Probability(closed)
	e := &Posterior{Space: j.Space}
	for _, l := range labels(j.Space) {
		if !closed(l) {
			e.labels = append(e.labels, l)
		}
	}
	r, err := quadrature.Integrate(context.Background(), e.problem(j.Posterior, nil), options(2, 0, false))
	if err != nil {
		t.Fatal(err)
	}
	e.take(r)
	e.gatherRare()
	if got := e.Probability(closed); len(e.rare) == 0 || math.Abs(got.P-want.P) > 1e-3 {
		t.Errorf("P(closed) %.5f from %d nodes, want %.5f", got.P, len(e.rare), want.P)
	}
}

// A posterior of three parameters that a prior cuts has no frame: the borders between
// its fates must be found nevertheless, and no error left open can become a limit.
func TestCutByPrior(t *testing.T) {
	e := integrate(t, jobtest.Committed(t, "fate.toml", "data.2.keep=z < 0.4"))
	if e.frame != nil || e.Fine() {
		t.Fatal("the prior no longer cuts this posterior")
	}
	if by := e.Unresolved(); by != 0 {
		t.Errorf("a class is only known to ±%g", by)
	}
	// From a chain of 80,000 effective samples: 0.235 ± 0.001.
	if p := e.Probability(closed); math.Abs(p.P-0.235) > 0.004 || !(p.Err < 0.001) {
		t.Errorf("P(closed) = %+v", p)
	}
}

func TestShare(t *testing.T) {
	none := math.NaN()
	for _, c := range []struct {
		yes, no quadrature.Estimate
		can     [2]bool
		want    outlook.Share
	}{
		{quadrature.Estimate{Value: 0.3, Err: 0.01}, quadrature.Estimate{Value: 0.7, Err: 0.02}, [2]bool{true, true}, outlook.Share{P: 0.3, Err: 0.01, Upper: none, Lower: none}},
		{quadrature.Estimate{Value: 0.7, Err: 0.02}, quadrature.Estimate{Value: 0.3, Err: 0.01}, [2]bool{true, true}, outlook.Share{P: 0.7, Err: 0.01, Upper: none, Lower: none}},
		{quadrature.Estimate{Value: 1e-4, Err: 1e-4}, quadrature.Estimate{Value: 0.9999, Err: 0.5}, [2]bool{true, true}, outlook.Share{P: 0, Err: 1e-4, Upper: 3e-4, Lower: none}},
		{quadrature.Estimate{Value: 1, Err: 0.5}, quadrature.Estimate{Value: 0, Err: 1e-15}, [2]bool{true, true}, outlook.Share{P: 1, Err: 1e-15, Upper: none, Lower: 1 - 1e-12}},
		{quadrature.Estimate{Value: 0.05, Err: 0.5}, quadrature.Estimate{Value: 0.95, Err: 0.5}, [2]bool{true, true}, outlook.Share{P: 0.05, Err: 0.5, Upper: none, Lower: none}},
		{quadrature.Estimate{Value: 0.8, Err: 0.9}, quadrature.Estimate{Value: 0.2, Err: 0.9}, [2]bool{true, true}, outlook.Share{P: 0.8, Err: 0.9, Upper: none, Lower: none}},
		{quadrature.Estimate{}, quadrature.Estimate{Value: 1}, [2]bool{false, true}, outlook.Share{Upper: none, Lower: none}},
	} {
		got := share(c.yes, c.no, c.can[0], c.can[1])
		if diff := cmp.Diff(c.want, got, cmpopts.EquateNaNs(), cmpopts.EquateApprox(1e-12, 1e-13)); diff != "" {
			t.Errorf("%+v and %+v: %s", c.yes, c.no, diff)
		}
	}
}

// survey is a posterior of Om and OL from 60 distance moduli of this error between z =
// 0.05 and 1.5, as a flat universe with Om = 0.3 has them.
func survey(t *testing.T, err float64) *likelihood.Posterior {
	t.Helper()
	u := model.Universe{Om: 0.3, OL: 0.7, W0: -1, H0: 70}
	sn := &data.Supernovae{}
	for i := range 60 {
		z := 0.05 + 1.45*float64(i)/59
		sn.Z, sn.Value, sn.Err = append(sn.Z, z), append(sn.Value, u.DistanceModulus(z, z)), append(sn.Err, err)
	}
	term, e := likelihood.NewSupernovae(sn, nil, likelihood.Offset{}, likelihood.Standing{})
	if e != nil {
		t.Fatal(e)
	}
	om, e1 := likelihood.Flat(0, 2)
	ol, e2 := likelihood.Flat(-1, 2)
	if e := errors.Join(e1, e2); e != nil {
		t.Fatal(e)
	}
	space, e := likelihood.NewSpace(likelihood.Family{RequireBigBang: true, Free: []likelihood.Parameter{{Name: "Om", Prior: om}, {Name: "OL", Prior: ol}}})
	if e != nil {
		t.Fatal(e)
	}
	p, e := likelihood.NewPosterior(space, term)
	if e != nil {
		t.Fatal(e)
	}
	return p
}

// gauss integrates f from a to b by Gauss and Legendre's rule on panels.
func gauss(f func(x float64) float64, a, b float64, panels int) float64 {
	sum := 0.0
	for i := range panels {
		lo := a + (b-a)*float64(i)/float64(panels)
		sum += quad.Fixed(f, lo, lo+(b-a)/float64(panels), 20, quad.Legendre{}, 0)
	}
	return sum
}

// recollapseBelow is the line of Carroll, Press & Turner 1992 under which a universe of
// matter and a constant recollapses.
func recollapseBelow(om float64) float64 {
	if om <= 1 {
		return 0
	}
	return 4 * om * math.Pow(math.Cos(math.Acos((1-om)/om)/3+4*math.Pi/3), 3)
}

// Errors of the distances that make a recollapse a chance of 1 in 10⁸: it is known to 1%,
// and so is a commoner one.
func TestRareFate(t *testing.T) {
	recollapse := func(l outlook.Label) bool { return l.Fate == model.Recollapse }
	for _, c := range []struct{ err, order float64 }{{0.0488, 1e-8}, {0.085, 1e-3}} {
		p := survey(t, c.err)
		e, err := Integrate(context.Background(), p, nil, 0)
		if err != nil {
			t.Fatal(err)
		}
		density := p.Evaluator().LogDensity
		at := func(om float64) func(ol float64) float64 {
			return func(ol float64) float64 { return math.Exp(density([]float64{om, ol}) - e.LogBest) }
		}
		all := gauss(func(om float64) float64 { return gauss(at(om), -1, 1.7, 20) }, 0, 2, 20)
		below := gauss(func(om float64) float64 { return gauss(at(om), -1, recollapseBelow(om), 12) }, 0, 1, 12) +
			gauss(func(om float64) float64 { return gauss(at(om), -1, recollapseBelow(om), 12) }, 1, 2, 6)
		want, got := below/all, e.Probability(recollapse)
		t.Logf("errors of %g mag: P(recollapse) = %.4g ± %.1g, by Gauss and Legendre %.4g", c.err, got.P, got.Err, want)
		if !(math.Abs(got.P/want-1) < 0.01) || !(got.P > c.order/4 && got.P < 4*c.order) {
			t.Errorf("errors of %g mag: P(recollapse) = %.4g ± %.1g, want %.4g", c.err, got.P, got.Err, want)
		}
	}
}

// The curvature of the frame is that of the Gaussian, its box holds all of it.
func TestFrame(t *testing.T) {
	mean := []float64{1, -2, 3}
	density := func(x []float64) float64 {
		a, b, c := x[0]-mean[0], x[1]-mean[1], x[2]-mean[2]
		return -0.5 * (a*a + math.Pow((b-2*a)/0.1, 2) + math.Pow((c+b)/0.02, 2))
	}
	f := newFrame(density, mean, []float64{-20, -60, -60}, []float64{20, 60, 60})
	if f == nil {
		t.Fatal("no frame")
	}
	for i, want := range []float64{1, math.Hypot(2, 0.1), math.Sqrt(4 + 0.01 + 0.0004)} {
		if got := f.sd(i); math.Abs(got/want-1) > 1e-6 {
			t.Errorf("sd %d is %v, want %v", i, got, want)
		}
		if !(f.extent[i] >= reach && f.extent[i] < 1.1*reach) {
			t.Errorf("the box of a Gaussian reaches to %v", f.extent[i])
		}
	}
	if got, want := f.logVolume(), math.Log(0.1*0.02); math.Abs(got-want) > 1e-6 {
		t.Errorf("ln |L| = %v, want %v", got, want)
	}
	if newFrame(density, mean, []float64{-2, -60, -60}, []float64{20, 60, 60}) != nil {
		t.Error("a frame though the prior cuts the posterior")
	}
}

// Points of equal weight have the moments of the posterior, and a reweighting with the
// ratio one changes nothing.
func TestSampleAndReweight(t *testing.T) {
	for _, name := range []string{"supernovae.toml", "fate.toml"} {
		e := integrate(t, jobtest.Committed(t, name))
		var mean, square float64
		points := e.Sample(4000)
		for _, x := range points {
			mean += x[0] / float64(len(points))
			square += x[0] * x[0] / float64(len(points))
		}
		sd := math.Sqrt(square - mean*mean)
		if len(points) != 4000 || math.Abs(mean-e.Marginal(0).Mean) > 0.01*sd || math.Abs(sd/e.Marginal(0).SD-1) > 0.01 {
			t.Errorf("%s: %d points, Om %.5f ± %.5f, want %.5f ± %.5f", name, len(points), mean, sd, e.Marginal(0).Mean, e.Marginal(0).SD)
		}
		r, err := e.Reweighted(func([]float64) float64 { return 2 })
		if err != nil {
			t.Fatal(err)
		}
		a, b := e.Probability(closed), r.Probability(closed)
		if math.Abs(a.P-b.P) > 1e-4 || math.Abs(r.LogMean-math.Ln2) > 1e-9 || math.Abs(r.Effective-1) > 1e-9 {
			t.Errorf("%s: P(closed) %.6f became %.6f; ln mean %v, effective %v", name, a.P, b.P, r.LogMean, r.Effective)
		}
	}
}
