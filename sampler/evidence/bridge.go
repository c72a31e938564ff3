package evidence

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"sync"

	"gonum.org/v1/gonum/stat"
)

// Sample is a posterior sample in the order it was drawn, one ensemble after the other, burn-in removed.
type Sample struct {
	X    []float64 // draws, row-major
	LogP []float64 // ln p at each, as the density gives it
	ESS  float64   // how many independent draws it is worth: the smallest over the parameters
}

// Target is the density that was sampled, ln p or -Inf (or NaN) outside its support, and the box around its
// support. Density makes one function per goroutine, which may own scratch memory.
type Target struct {
	Density func() func(x []float64) float64
	Lo, Hi  []float64
}

// Result is ln of the integral of p with its standard error.
type Result struct {
	LogEvidence Estimate
	Iterations  int
	Warnings    []string // nil when all went well
}

const (
	// blocks is how many stretches the sample is cut into: one for the proposal, one for the estimate, in
	// turns, so that both halves see every ensemble and hardly know of each other.
	blocks = 40
	// fewest independent draws that give an estimate at all; below warnBelow its error is a rough one.
	fewest, warnBelow = 20, 400
	// The number of proposal draws is that of the draws used for the estimate, within these bounds.
	leastProposals, mostProposals = 10_000, 200_000
)

// Bridge estimates the evidence by bridge sampling with the optimal bridge function (Meng & Wong 1996, Stat.
// Sinica 6:831, eq. 4.1; in the form of Gronau et al. 2017, J. Math. Psych. 81:80, eq. 15). Same input and
// seed, same result, whatever the number of cores.
func Bridge(ctx context.Context, s Sample, t Target, seed uint64) (*Result, error) {
	dim, n := len(t.Lo), len(s.LogP)
	if t.Density == nil || dim == 0 || len(t.Hi) != dim || len(s.X) != n*dim {
		panic("evidence: a target needs a density and a box, a sample one ln p for each draw of its dimension")
	}
	if !(s.ESS >= fewest) || n < 4*blocks || n < 4*blocks*dim/10 {
		return nil, fmt.Errorf("%d draws worth %.3g independent ones are too few for the evidence: at least %d and %d are needed",
			n, s.ESS, 4*blocks, fewest)
	}
	b := box{t.Lo, t.Hi}
	fitting, estimating, err := b.halves(s)
	if err != nil {
		return nil, err
	}
	g, err := fit(fitting.x, dim)
	if err != nil {
		return nil, err
	}
	count := min(max(len(estimating.logp), leastProposals), mostProposals)
	proposed, err := propose(ctx, g, b, t, count, seed)
	if err != nil {
		return nil, err
	}
	drawn := make([]float64, len(estimating.logp))
	for i, v := range estimating.logp {
		drawn[i] = v - g.logDensity(estimating.x[i*dim:(i+1)*dim])
	}
	return estimate(drawn, proposed, math.Min(s.ESS/2, float64(len(drawn))))
}

// half is half of a sample in the open space: draws, and ln p with the Jacobian.
type half struct{ x, logp []float64 }

// halves maps the sample and deals it out in blocks.
func (b box) halves(s Sample) (fitting, estimating half, err error) {
	dim, n := len(b.lo), len(s.LogP)
	t := make([]float64, dim)
	for i, logp := range s.LogP {
		x := s.X[i*dim : (i+1)*dim]
		for k, v := range x {
			if !(v >= b.lo[k] && v <= b.hi[k]) {
				return fitting, estimating, fmt.Errorf("draw %d has coordinate %d at %g, outside the box [%g, %g]", i+1, k+1, v, b.lo[k], b.hi[k])
			}
		}
		if math.IsNaN(logp) || math.IsInf(logp, 0) {
			return fitting, estimating, fmt.Errorf("ln p of draw %d is %g: a posterior draw has a finite one", i+1, logp)
		}
		to := &fitting
		if i*blocks/n%2 == 1 {
			to = &estimating
		}
		to.logp = append(to.logp, logp+b.toOpen(t, x))
		to.x = append(to.x, t...)
	}
	return fitting, estimating, nil
}

// propose returns ln p/g at count draws of the proposal: drawn one after the other, evaluated in parallel.
func propose(ctx context.Context, g *proposal, b box, target Target, count int, seed uint64) ([]float64, error) {
	dim := len(b.lo)
	x, ratio := make([]float64, count*dim), make([]float64, count)
	rng := rand.New(rand.NewPCG(seed, 0xb5297a4d3f84d5b5))
	t := make([]float64, dim)
	for i := range ratio {
		g.draw(t, rng)
		ratio[i] = b.toBox(x[i*dim:(i+1)*dim], t) - g.logDensity(t)
	}
	var wg sync.WaitGroup
	workers := runtime.GOMAXPROCS(0)
	for w := range workers {
		density := target.Density()
		wg.Go(func() {
			for i := w * count / workers; i < (w+1)*count/workers && ctx.Err() == nil; i++ {
				logp := density(x[i*dim : (i+1)*dim])
				if math.IsNaN(logp) {
					logp = math.Inf(-1)
				}
				ratio[i] += logp
			}
		})
	}
	wg.Wait()
	return ratio, ctx.Err()
}

// estimate iterates r = mean_g[l/(s1·l + s2·r)] / mean_p[1/(s1·l + s2·r)] to its fixed point, l being p/g at
// the draws of either kind; s1 and s2 are the shares of independent draws.
func estimate(drawn, proposed []float64, ess float64) (*Result, error) {
	shift := median(drawn) // in units of which nothing overflows
	scaled := func(logs []float64) []float64 {
		l := make([]float64, len(logs))
		for i, v := range logs {
			l[i] = math.Exp(v - shift)
		}
		return l
	}
	b := bridge{drawn: scaled(drawn), proposed: scaled(proposed), ess: ess}
	s := ess / (ess + float64(len(proposed)))
	b.s1, b.s2 = s, 1-s
	r := 1.0
	for it := 1; it <= 1000; it++ {
		next := b.step(r)
		if !(next > 0) || math.IsInf(next, 0) {
			break
		}
		if math.Abs(next-r) <= 1e-12*r {
			e := Estimate{shift + math.Log(next), b.relativeError(next)}
			return &Result{LogEvidence: e, Iterations: it, Warnings: warnings(ess, e.Err)}, nil
		}
		r = next
	}
	return nil, errors.New("the bridge estimate does not converge: the draws and the density do not belong together, or the posterior is in several far pieces")
}

type bridge struct {
	drawn, proposed []float64 // p/g
	s1, s2          float64
	ess             float64
}

func (b *bridge) step(r float64) float64 {
	var num, den float64
	for _, l := range b.proposed {
		if !math.IsInf(l, 1) {
			l /= b.s1*l + b.s2*r
		} else {
			l = 1 / b.s1
		}
		num += l
	}
	for _, l := range b.drawn {
		den += 1 / (b.s1*l + b.s2*r)
	}
	return num / float64(len(b.proposed)) / (den / float64(len(b.drawn)))
}

// relativeError is the relative root-mean-square error of the estimate (Frühwirth-Schnatter 2004, Econometrics
// J. 7:143; Gronau et al. 2017, eq. 16). The variance of the mean over the posterior draws is the larger of
// two: that of as many independent draws as the sample is worth, and that between the blocks, which knows of
// correlations of the ratio itself.
func (b *bridge) relativeError(r float64) float64 {
	f := make([]float64, len(b.proposed))
	for i, l := range b.proposed {
		f[i] = 1 / (b.s1 + b.s2*r/l) // l = 0 outside the support: 1/∞
	}
	m, v := stat.MeanVariance(f, nil)
	relative := v / (m * m) / float64(len(f))
	f = f[:0]
	for _, l := range b.drawn {
		f = append(f, 1/(b.s1*l+b.s2*r))
	}
	m, v = stat.MeanVariance(f, nil)
	const parts = blocks / 2
	means := make([]float64, parts)
	for k := range means {
		means[k] = stat.Mean(f[k*len(f)/parts:(k+1)*len(f)/parts], nil)
	}
	return math.Sqrt(relative + math.Max(v/b.ess, stat.Variance(means, nil)/parts)/(m*m))
}

func warnings(ess, err float64) (w []string) {
	if 2*ess < warnBelow {
		w = append(w, fmt.Sprintf("the sample is worth %.0f independent draws: the error of ln evidence is itself uncertain below %d, sample longer", 2*ess, warnBelow))
	}
	if err > 0.2 {
		w = append(w, fmt.Sprintf("ln evidence is only known to %.2f: sample longer, or tighten the box around the posterior", err))
	}
	return w
}

func median(x []float64) float64 {
	s := slices.Sorted(slices.Values(x))
	return s[len(s)/2]
}
