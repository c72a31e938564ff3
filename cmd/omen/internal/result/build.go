package result

import (
	"fmt"
	"math"
	"slices"

	"omen/cmd/omen/internal/job"
	"omen/likelihood"
	"omen/model"
	"omen/sampler"

	"gonum.org/v1/gonum/stat/distuv"
)

// Run is what a summary is made from: a job, its chain and how the chain ended.
type Run struct {
	Job     *job.Job
	Chain   *sampler.Chain
	Outcome sampler.Outcome
	Best    []float64 // the point of highest posterior density
	Seconds float64
	Threads int // 0: one per processor; no result depends on it
	Version string

	OutOfTime bool // interrupted by the run's own limit of time
}

// Ended says in a word or two why a run is unfinished, nothing if it is not.
func (r Run) Ended() string {
	switch {
	case r.OutOfTime:
		return "time limit"
	case r.Outcome.Stop == sampler.Converged:
		return ""
	}
	return r.Outcome.Stop.String()
}

// Build makes the summary of a run.
func Build(r Run) *Summary {
	check := r.Outcome.Check
	view := r.Chain.View().After(check.BurnIn)
	s := &Summary{Schema: Schema, Title: r.Job.Run.Title, Version: r.Version,
		Complete: r.Outcome.Stop == sampler.Converged}
	s.Parameters = parameters(r, view)
	d := derive(r.Job.Space, thinForDerived(view, check), r.Threads)
	s.Derived = derived(d, r.Threads)
	s.Fates, s.FatesHeldW, s.Today = d.fates(check.ESS())
	s.Fit = fit(r)
	s.Sampling = sampling(r, view)
	s.Assumptions = assumptions(r.Job)
	for _, in := range r.Job.Inputs {
		s.Inputs = append(s.Inputs, InputFile(in))
	}
	s.Warnings = warnings(r, s, view)
	return s
}

// parameters summarises the free parameters.
func parameters(r Run, view sampler.View) []Quantity {
	free := r.Job.Space.Free()
	draws := make([]sampler.Draws, len(free))
	for i := range free {
		draws[i] = view.Coordinate(i)
	}
	var out []Quantity
	for i, sum := range sampler.SummarizeAll(draws, r.Threads) {
		q := quantity(free[i].Name, sum)
		q.Constrained = constrained(free[i].Prior, sum)
		out = append(out, q)
	}
	return out
}

// asWide is how wide, as a fraction of the prior's 68% interval, a marginal
// posterior must be to count as not constrained. A flat prior that the data
// narrow by a tenth has learnt next to nothing.
const asWide = 0.9

// constrained compares the posterior's central 68% interval with the prior's. A
// normal prior is knowledge of its own: what it alone decides is constrained.
func constrained(p likelihood.Prior, s sampler.Summary) bool {
	if p.Informative() {
		return true
	}
	return s.Interval68[1]-s.Interval68[0] < asWide*(p.Quantile(0.84)-p.Quantile(0.16))
}

func quantity(name string, s sampler.Summary) Quantity {
	pair := func(v [2]float64) [2]Number { return [2]Number{Number(v[0]), Number(v[1])} }
	return Quantity{Name: name, Unit: likelihood.Unit(name), Mean: Number(s.Mean), SD: Number(s.SD), Median: Number(s.Median),
		Interval68: pair(s.Interval68), Interval95: pair(s.Interval95), HDI68: pair(s.HDI68),
		MCSE: Number(s.MCSE), MCSE68: pair(s.MCSE68), MCSE95: pair(s.MCSE95),
		ESS: Number(s.ESS), RHat: Number(s.RHat), Constrained: true}
}

// fit evaluates the best point table by table.
func fit(r Run) Fit {
	p := r.Job.Posterior
	each := make([]float64, len(p.Terms()))
	p.Evaluator().TermChi2(r.Best, each)
	f := Fit{DoF: p.DegreesOfFreedom(), Rows: p.Rows(), Best: map[string]Number{}, Probability: Number(math.NaN())}
	sum := 0.0
	for i, t := range p.Terms() {
		sum += each[i]
		f.Tables = append(f.Tables, TableFit{r.Job.Tables[i].Name, r.Job.Tables[i].Spec.Kind, t.Rows(), Number(each[i])})
	}
	f.Chi2 = Number(sum)
	for i, free := range r.Job.Space.Free() {
		f.Best[free.Name] = Number(r.Best[i])
	}
	if f.DoF > 0 && sum >= 0 {
		f.Probability = Number(distuv.ChiSquared{K: float64(f.DoF)}.Survival(sum))
	}
	return f
}

func sampling(r Run, view sampler.View) Sampling {
	check := r.Outcome.Check
	return Sampling{Ensembles: view.Ensembles(), Walkers: view.Walkers(), Steps: r.Chain.Steps(), BurnIn: check.BurnIn,
		Acceptance: Number(check.Acceptance), Evaluations: check.Evaluations, Seconds: r.Seconds,
		Seed: r.Job.Run.Sampling.Seed, MinESS: Number(check.ESS()), MaxRHat: Number(check.RHat()),
		Goal: r.Job.Run.Sampling.EffectiveSamples}
}

// derivedNames lists the derived quantities that a space has.
func derivedNames(s *likelihood.Space) []string {
	names := []string{"Ok", "q0"}
	if s.Family().Flat {
		names = []string{"OL", "q0"}
	}
	free := func(n string) bool {
		return slices.ContainsFunc(s.Free(), func(p likelihood.Parameter) bool { return p.Name == n })
	}
	if s.KnowsHRd() && !free("hrd") {
		names = append(names, "hrd")
	}
	if free("ob") {
		names = append(names, "rd")
	}
	if s.KnowsH0() {
		names = append(names, "age")
	}
	return append(names, "H0t0")
}

// value computes a derived quantity; age needs AgeToday, handed in because it is
// the costly part.
func value(name string, p *likelihood.Point, age float64) float64 {
	u := p.Universe
	switch name {
	case "Ok":
		return u.Ok()
	case "OL":
		return u.OL
	case "q0":
		return u.Q0()
	case "hrd":
		return p.HRd
	case "rd":
		return p.HRd * 100 / u.H0
	case "age":
		return age
	}
	return age / u.HubbleTime()
}

// derivation is the derived draws of a chain: the named quantities, then the
// fate, the fate with w held, and whether a universe is closed and accelerating.
type derivation struct {
	names            []string
	draws            []sampler.Draws
	fate, held       sampler.Draws
	closed, speeding sampler.Draws
	energy           likelihood.DarkEnergy
	evolving         bool // w changes, so that the far future is an extrapolation
	flat, bigBang    bool
}

func derive(space *likelihood.Space, view sampler.View, threads int) derivation {
	f := space.Family()
	d := derivation{names: derivedNames(space), energy: f.DarkEnergy, evolving: f.DarkEnergy == likelihood.W0Wa,
		flat: f.Flat, bigBang: f.RequireBigBang}
	n := len(d.names)
	all := view.MapAll(n+4, threads, func() func(x, y []float64) {
		var p likelihood.Point
		return func(x, y []float64) {
			space.Point(x, &p)
			u := p.Universe
			age := u.AgeToday()
			for i, name := range d.names {
				y[i] = value(name, &p, age)
			}
			y[n] = float64(u.Fate())
			y[n+1] = float64(u.Frozen().Fate())
			y[n+2] = indicator(u.Ok() < 0)
			y[n+3] = indicator(u.Q0() < 0)
		}
	})
	d.draws, d.fate, d.held, d.closed, d.speeding = all[:n], all[n], all[n+1], all[n+2], all[n+3]
	return d
}

func indicator(yes bool) float64 {
	if yes {
		return 1
	}
	return 0
}

// thinForDerived keeps steps about half an autocorrelation time apart: what lies
// between costs as much and adds next to nothing.
func thinForDerived(v sampler.View, c sampler.Check) sampler.View {
	shortest := math.Inf(1)
	for _, p := range c.Parameters {
		shortest = math.Min(shortest, p.Tau)
	}
	k := int(shortest / 4 / float64(v.Spacing()))
	return v.Thin(max(k, 1))
}

func derived(d derivation, threads int) []Quantity {
	var out []Quantity
	for i, s := range sampler.SummarizeAll(d.draws, threads) {
		out = append(out, quantity(d.names[i], s))
	}
	return out
}

// fates turns the draws of fates into probabilities. Exactly critical and
// exactly coasting universes have no volume in a continuous posterior and are
// left out unless one was drawn.
func (d derivation) fates(ess float64) (fates, held, today []Fate) {
	fates = d.fateTable(d.fate, ess)
	if d.evolving {
		held = d.fateTable(d.held, ess)
	}
	today = append(today, share("accelerating", d.speeding, ess))
	if !d.flat {
		today = append(today, share("closed (Ok < 0)", d.closed, ess))
	}
	return fates, held, today
}

func (d derivation) fateTable(draws sampler.Draws, ess float64) []Fate {
	var out []Fate
	for _, f := range model.Fates() {
		is := draws.Map(func(x float64) float64 { return indicator(x == float64(f)) })
		s := share(f.String(), is, ess)
		if s.Probability == 0 && !d.possible(f) {
			continue
		}
		out = append(out, s)
	}
	return out
}

// possible tells the fates that have a volume in the family: a big rip needs
// dark energy that can grow, no big bang a family that admits bounces.
func (d derivation) possible(f model.Fate) bool {
	switch f {
	case model.Critical, model.Coasting:
		return false
	case model.BigRip:
		return d.energy != likelihood.Constant
	case model.NoBigBang:
		return !d.bigBang
	}
	return true
}

func share(name string, draws sampler.Draws, ess float64) Fate {
	p := sampler.Proportion(draws, ess)
	f := Fate{Name: name, Probability: Number(p.P), Error: Number(p.Error), Upper95: Number(math.NaN())}
	switch p.P {
	case 0:
		f.Upper95 = Number(p.Upper95)
	case 1:
		f.Upper95 = Number(1 - p.Lower95) // of the opposite
	}
	return f
}

// assumptions writes down the priors and what was taken for granted.
func assumptions(j *job.Job) []string {
	f := j.Space.Family()
	var out []string
	for _, p := range f.Free {
		out = append(out, fmt.Sprintf("%s: %s", p.Name, p.Prior.String()))
	}
	for _, name := range likelihood.Names() {
		if v, ok := f.Fixed[name]; ok {
			out = append(out, fmt.Sprintf("%s = %g, fixed", name, v))
		}
	}
	out = append(out, geometryWords(f), energyWords(f), radiationWords(j.Space))
	if f.RequireBigBang {
		out = append(out, "there was a big bang: universes that bounced are left out")
	}
	for i, t := range j.Tables {
		if t.Supernovae != nil {
			out = append(out, offsetWords(t.Name, j.Run, i))
		}
	}
	return out
}

func geometryWords(f likelihood.Family) string {
	if f.Flat {
		return "space is flat: OL follows from Om"
	}
	return "space may be curved"
}

func energyWords(f likelihood.Family) string {
	switch f.DarkEnergy {
	case likelihood.W:
		return "dark energy has a constant equation of state w0"
	case likelihood.W0Wa:
		s := "dark energy has w(a) = w0 + wa (1-a); for wa ≠ 0 its far future is an extrapolation of that formula"
		if f.RequireMatterEra {
			s += "; w0 + wa < 0, so that matter once ruled"
		}
		return s
	}
	return "dark energy is a cosmological constant"
}

func radiationWords(s *likelihood.Space) string {
	f := s.Family()
	switch {
	case f.FromTemperature && s.KnowsH0():
		return "radiation from the CMB temperature (2.7255 K, 3.044 massless neutrinos)"
	case f.FromTemperature:
		return fmt.Sprintf("radiation from the CMB temperature, with H0 = %d km/s/Mpc for that purpose alone", likelihood.ReferenceH0)
	case f.Radiation == 0:
		return "radiation is ignored"
	}
	return fmt.Sprintf("radiation Or = %g", f.Radiation)
}
