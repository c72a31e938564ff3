package nested

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"sync"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/sampler"
	"omen/sampler/evidence"
)

// bridged is the method of evidences that come from a chain.
const bridged = "bridge sampling"

// Fitted is a model with what the data say of it.
type Fitted struct {
	Model
	Method      string            // "quadrature", "bridge sampling", or "point" where nothing is free
	Parameters  int               // free ones, marginalised offsets included
	Rows        int               // of data, bounds left out
	Best        []float64         // the point of highest posterior density
	Chi2        float64           // there
	Admitted    float64           // fraction of the prior that the family admits, over which the prior is normalised
	LogEvidence evidence.Estimate // ln of the mean likelihood over the prior, up to a constant of the data
	Belief      outlook.Belief    // nil if Why is set
	Why         string            // why the data rule the model out altogether, "" if they do not
	Odds        float64           // prior
	Probability evidence.Estimate // posterior, among the models
	Warnings    []string

	space *likelihood.Space
}

// AIC is Akaike's information criterion, up to the constant that chi² lacks.
func (f *Fitted) AIC() float64 { return evidence.AIC(-f.Chi2/2, f.Parameters) }

// BIC is the Bayesian information criterion, likewise.
func (f *Fitted) BIC() float64 { return evidence.BIC(-f.Chi2/2, f.Parameters, f.Rows) }

// Own is what is known already of the run's own family: its integral, or a sample of
// it.
type Own struct {
	Exact *exact.Posterior // nil if it was not integrated
	Drawn *outlook.Drawn   // nil without a chain, or beside an integral
	Best  []float64
}

// Options say how the other models are explored.
type Options struct {
	Seed    uint64
	Threads int
	Odds    map[string]float64 // by name; 1 where a model has none
}

// Comparison is the models with their probabilities.
type Comparison struct {
	Models []Fitted
}

// Compare fits every model that the family of a posterior contains to the same data:
// by quadrature up to three free parameters, by a chain and bridge sampling beyond.
func Compare(ctx context.Context, p *likelihood.Posterior, own Own, o Options) (*Comparison, error) {
	models := Models(p.Space().Family())
	fits, errs := make([]*Fitted, len(models)), make([]error, len(models))
	var group sync.WaitGroup
	free := make(chan struct{}, threads(o))
	for i, m := range models {
		free <- struct{}{}
		group.Go(func() {
			fits[i], errs[i] = fit(ctx, p, m, own, o)
			<-free
		})
	}
	group.Wait()
	c := &Comparison{}
	for i, m := range models {
		if errs[i] != nil {
			return nil, fmt.Errorf("%s: %w", m.Words, errs[i])
		}
		f := fits[i]
		f.Odds = 1
		if odds, ok := o.Odds[m.Name]; ok {
			f.Odds = odds
		}
		c.Models = append(c.Models, *f)
	}
	return c, c.weigh()
}

// threads is how many models are fitted at a time.
func threads(o Options) int {
	if o.Threads > 0 {
		return o.Threads
	}
	return runtime.GOMAXPROCS(0)
}

// OddsError says that the odds which were given leave no model that the data allow.
type OddsError struct{ Err error }

func (e *OddsError) Error() string {
	return fmt.Sprintf("fates.odds: %v; give a model that the data allow odds above 0", e.Err)
}

// Unwrap is the cause.
func (e *OddsError) Unwrap() error { return e.Err }

// weigh turns evidences and odds into probabilities.
func (c *Comparison) weigh() error {
	logs, odds := make([]evidence.Estimate, len(c.Models)), make([]float64, len(c.Models))
	for i := range c.Models {
		logs[i], odds[i] = c.Models[i].LogEvidence, c.Models[i].Odds
	}
	p, err := evidence.Probabilities(logs, odds)
	if err != nil {
		return &OddsError{err}
	}
	for i := range p {
		c.Models[i].Probability = p[i]
	}
	return nil
}

// fit explores one model.
func fit(ctx context.Context, p *likelihood.Posterior, m Model, own Own, o Options) (*Fitted, error) {
	f := &Fitted{Model: m, Method: "quadrature", space: p.Space()}
	if !m.Own {
		space, err := likelihood.NewSpace(m.Family)
		if err != nil {
			return nil, err
		}
		if p, err = likelihood.NewPosterior(space, p.Terms()...); err != nil {
			return nil, err
		}
		f.space, own = space, Own{}
	}
	f.Rows, f.Parameters = p.Measurements(), p.Parameters()
	volume, err := Volume(ctx, f.space)
	if err != nil {
		return nil, err
	}
	f.Admitted = math.Exp(volume.Value)
	switch dim := f.space.Dim(); {
	case dim == 0:
		f.point(p)
	case own.Exact != nil:
		f.integrated(own.Exact)
	case own.Drawn == nil && dim <= exact.Most:
		err = f.integrate(ctx, p, o)
	default:
		err = f.bridge(ctx, p, own, o)
	}
	if err != nil {
		return nil, err
	}
	if f.Why == "" && f.space.Dim() > 0 {
		f.Chi2 = p.Evaluator().Chi2(f.Best)
	}
	f.LogEvidence.Value -= volume.Value
	f.LogEvidence.Err = math.Hypot(f.LogEvidence.Err, volume.Err)
	return f, nil
}

// point is a model without freedom: its evidence is its likelihood.
func (f *Fitted) point(p *likelihood.Posterior) {
	f.Method, f.Best = "point", []float64{}
	f.Chi2 = p.Evaluator().Chi2(nil)
	f.LogEvidence.Value = -f.Chi2 / 2
	if math.IsNaN(f.Chi2) {
		f.rule("it makes no prediction for these data")
		return
	}
	var point likelihood.Point
	f.space.Point(nil, &point)
	f.Belief = outlook.Certain{Label: outlook.LabelOf(point.Universe)}
}

func (f *Fitted) rule(why string) {
	f.Why, f.Chi2, f.LogEvidence = why, math.NaN(), evidence.Estimate{Value: math.Inf(-1)}
}

func (f *Fitted) integrate(ctx context.Context, p *likelihood.Posterior, o Options) error {
	e, err := exact.Try(ctx, p, nil, o.Threads)
	switch {
	case exact.NoSupport(err):
		f.rule("within the priors it makes no prediction")
		return nil
	case err != nil:
		return err
	case e.Unresolved() > 0:
		return f.bridge(ctx, p, Own{}, o)
	}
	f.integrated(e)
	return nil
}

func (f *Fitted) integrated(e *exact.Posterior) {
	f.Best, f.Belief, f.Warnings = e.Best, e, e.Warnings
	f.LogEvidence = evidence.Estimate(e.LogEvidence)
}

// bridge estimates the evidence from a chain.
func (f *Fitted) bridge(ctx context.Context, p *likelihood.Posterior, own Own, o Options) (err error) {
	f.Method, f.Best = bridged, own.Best
	drawn := own.Drawn
	if drawn == nil {
		if drawn, f.Best, err = explore(ctx, p, o); err != nil {
			if errors.Is(err, errNowhere) {
				f.rule("within the priors it makes no prediction")
				return nil
			}
			return err
		}
	}
	lo, hi := f.space.Box()
	target := evidence.Target{Lo: lo, Hi: hi, Density: func() func([]float64) float64 { return p.Evaluator().LogDensity }}
	r, err := evidence.Bridge(ctx, sampleOf(drawn), target, o.Seed)
	if err != nil {
		return err
	}
	f.Belief, f.LogEvidence, f.Warnings = *drawn, r.LogEvidence, r.Warnings
	return nil
}

// bridgeDraws is how many draws a bridge is built on, about.
const bridgeDraws = 40_000

// sampleOf lays a view out as the bridge wants it, one ensemble after the other.
func sampleOf(d *outlook.Drawn) evidence.Sample {
	v := d.View
	v = v.Thin(max(1, v.Steps()*v.Ensembles()*v.Walkers()/bridgeDraws))
	s := evidence.Sample{ESS: d.ESS}
	for m := range v.Ensembles() {
		for i := range v.Steps() {
			x, logp := v.Step(i)
			s.X, s.LogP = append(s.X, x[m]...), append(s.LogP, logp[m]...)
		}
	}
	return s
}

var errNowhere = errors.New("the density is zero at every place tried")

const (
	ensembles = 4
	// effective samples of a nested model: a bridge on them knows ln evidence to
	// some 0.03.
	effective = 2000
	mostSteps = 200_000
)

// explore runs a short chain.
func explore(ctx context.Context, p *likelihood.Posterior, o Options) (*outlook.Drawn, []float64, error) {
	space := p.Space()
	lo, hi := space.Box()
	best, _, err := sampler.Maximise(p.Evaluator().LogDensity, lo, hi, o.Seed)
	if err != nil {
		return nil, nil, errNowhere
	}
	var densities []sampler.Density
	starts := make([][]float64, ensembles)
	for m := range starts {
		density := p.Evaluator().LogDensity
		if starts[m], err = sampler.Scatter(density, best, lo, hi, sampler.DefaultWalkers(space.Dim()), o.Seed, m); err != nil {
			return nil, nil, err
		}
		densities = append(densities, density)
	}
	chain, err := sampler.NewChain(space.Dim(), starts, 1, sampler.DefaultRecord)
	if err != nil {
		return nil, nil, err
	}
	settings := sampler.Settings{Seed: o.Seed, Effective: effective, MaxSteps: mostSteps, Threads: o.Threads}
	outcome, err := sampler.Run(ctx, densities, chain, settings, nil)
	if err == nil {
		err = ctx.Err()
	}
	if err != nil {
		return nil, nil, err
	}
	return Draws(space, outcome.Check, o.Threads), best, nil
}

// Draws labels the sample of a chain.
func Draws(space *likelihood.Space, check sampler.Check, threads int) *outlook.Drawn {
	codes := check.Sample.MapAll(1, threads, func() func(x, y []float64) {
		var p likelihood.Point
		return func(x, y []float64) {
			space.Point(x, &p)
			y[0] = outlook.LabelOf(p.Universe).Code()
		}
	})[0]
	return &outlook.Drawn{View: check.Sample, Codes: codes, ESS: check.ESS()}
}
