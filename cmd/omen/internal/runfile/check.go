package runfile

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"
	"time"

	"omen/data"
	"omen/likelihood"
)

// Kinds lists what a [[data]] table can hold.
func Kinds() []string { return []string{"supernovae", "bao", "ages", "rates"} }

func (r *Run) check() error {
	if err := r.checkWords(); err != nil {
		return err
	}
	if len(r.Data) == 0 {
		return r.Errorf("", "there are no data; add a [[data]] table with a kind and a table, for example\n[[data]]\nkind = \"supernovae\"\ntable = \"my.csv\"")
	}
	for i := range r.Data {
		if err := r.checkData(i); err != nil {
			return err
		}
	}
	if err := r.checkSampling(); err != nil {
		return err
	}
	f, err := r.Family()
	if err != nil {
		return err
	}
	if r.Sampling.Engine == "quadrature" && len(f.Free) > MostExact {
		return r.Errorf("sampling.engine", "quadrature goes to %d free parameters, this run has %d; choose engine = \"chain\", or hold parameters fixed", MostExact, len(f.Free))
	}
	return r.checkFates()
}

// MostExact is the number of free parameters up to which a posterior can be
// integrated by quadrature.
const MostExact = 3

func (r *Run) checkFates() error {
	for _, name := range slices.Sorted(maps.Keys(r.Fates.Odds)) {
		key := "fates.odds." + name
		if err := r.oneOf(key, name, Nested()...); err != nil {
			return err
		}
		if v := r.Fates.Odds[name]; !(v >= 0) || math.IsInf(v, 0) {
			return r.Errorf(key, "%s: found %v, expected prior odds, 0 or more", key, v)
		}
	}
	if v := r.Fates.Ahead; !(v >= 0) || v > 1000 {
		return r.Errorf("fates.ahead", "fates.ahead: found %v, expected 0 or up to 1000 Hubble times", v)
	}
	return nil
}

// Nested lists the names of the nested universes, from the simplest on.
func Nested() []string {
	return []string{"coasting", "critical", "matter-only", "flat-lambda", "curved-lambda",
		"flat-w", "curved-w", "flat-w0-wa", "curved-w0-wa"}
}

// oneOf checks a word against the ones that are known.
func (r *Run) oneOf(key, found string, known ...string) error {
	if slices.Contains(known, found) {
		return nil
	}
	return r.Errorf(key, "%s: found %q, expected one of %s; the nearest is %q", key, found,
		strings.Join(known, ", "), data.Nearest(found, known))
}

func (r *Run) checkWords() error {
	if err := r.oneOf("universe.geometry", r.Universe.Geometry, "curved", "flat"); err != nil {
		return err
	}
	return r.oneOf("universe.dark-energy", r.Universe.DarkEnergy, "constant", "w", "w0-wa")
}

func (r *Run) checkData(i int) error {
	d, key := &r.Data[i], fmt.Sprintf("data.%d", i+1)
	if d.Kind == "" {
		return r.Errorf(key, "the table has no kind; write one of kind = \"%s\"", strings.Join(Kinds(), `", "`))
	}
	if err := r.oneOf(key+".kind", d.Kind, Kinds()...); err != nil {
		return err
	}
	if d.Table == "" {
		return r.Errorf(key, "no file is named; write table = \"file.csv\", relative to this run file")
	}
	if d.CovarianceHolds != "" {
		if d.Covariance == "" {
			return r.Errorf(key+".covariance-holds", "covariance-holds without a covariance; name the file in covariance")
		}
		if err := r.oneOf(key+".covariance-holds", d.CovarianceHolds, "total", "added", "inverse"); err != nil {
			return err
		}
	}
	if d.Templates != "" && d.Covariance != "" {
		return r.Errorf(key+".templates", "found both templates and a covariance, expected one: the templates stand for a covariance, remove either")
	}
	if d.Kind != "supernovae" && (d.Offset != nil || d.StandsFor != nil) {
		return r.Errorf(key, "offset and stands-for belong to supernovae, this table is of kind %q; remove them", d.Kind)
	}
	if err := r.checkStandsFor(key+".stands-for", d.StandsFor); err != nil {
		return err
	}
	_, err := r.Offset(i)
	return err
}

func (r *Run) checkStandsFor(key string, s *StandsFor) error {
	switch {
	case s == nil:
		return nil
	case s.Rows < 1:
		return r.Errorf(key, "%s.rows: found %d, expected the number of measurements, 1 or more", key, s.Rows)
	case !(s.Chi2 >= 0) || math.IsInf(s.Chi2, 0):
		return r.Errorf(key, "%s.chi2: found %v, expected a finite number, 0 or more", key, s.Chi2)
	}
	return nil
}

// mostEffective is what the bounded record of a chain can show with some three
// draws for every effective one; see [sampler.DefaultRecord]. The other bounds lie
// far beyond any use, and well within the memory of a laptop.
const (
	mostEffective = 100_000
	mostEnsembles = 64
	mostWalkers   = 10_000
	mostThinning  = 1_000_000
)

func (r *Run) checkSampling() error {
	s := r.Sampling
	if err := r.oneOf("sampling.engine", s.Engine, "both", "chain", "quadrature"); err != nil {
		return err
	}
	wrong := func(key string, found int, want string) error {
		return r.Errorf("sampling."+key, "sampling.%s: found %d; expected %s", key, found, want)
	}
	switch {
	case s.Ensembles < 2 || s.Ensembles > mostEnsembles:
		return wrong("ensembles", s.Ensembles, fmt.Sprintf("2 to %d, for convergence is judged by comparing them (4 is the default)", mostEnsembles))
	case s.Walkers < 0 || s.Walkers%2 == 1 || s.Walkers > mostWalkers:
		return wrong("walkers", s.Walkers, fmt.Sprintf("an even number up to %d, or 0 to choose it", mostWalkers))
	case s.EffectiveSamples < 100:
		return wrong("effective-samples", s.EffectiveSamples, "at least 100")
	case s.EffectiveSamples > mostEffective:
		return wrong("effective-samples", s.EffectiveSamples, fmt.Sprintf("at most %d, which knows a mean to 0.3%% of its standard deviation", mostEffective))
	case s.RecordEvery < 1 || s.RecordEvery > mostThinning:
		return wrong("record-every", s.RecordEvery, fmt.Sprintf("1 to %d", mostThinning))
	case s.MaxSteps < 1:
		return wrong("max-steps", s.MaxSteps, "at least 1")
	}
	if err := r.checkUnit("sampling.max-time", s.MaxTime); err != nil {
		return err
	}
	return r.checkUnit("sampling.sync-interval", s.SyncInterval)
}

// checkUnit catches a duration that was written as a bare number, which the decoder
// takes for nanoseconds.
func (r *Run) checkUnit(key string, d Duration) error {
	if d == 0 || d >= Duration(time.Millisecond) {
		return nil
	}
	return r.Errorf(key, "%s: found %v, expected a duration in quotation marks with its unit, such as \"90s\" or \"8h\"", key, time.Duration(d))
}

// Family builds the family of universes with its priors.
func (r *Run) Family() (likelihood.Family, error) {
	f := likelihood.Family{Flat: r.Universe.Geometry == "flat", RequireBigBang: r.Universe.RequireBigBang,
		RequireMatterEra: r.Universe.RequireMatterEra, Fixed: map[string]float64{},
		DarkEnergy: map[string]likelihood.DarkEnergy{"w": likelihood.W, "w0-wa": likelihood.W0Wa}[r.Universe.DarkEnergy]}
	if err := r.radiation(&f); err != nil {
		return f, err
	}
	for _, name := range sortedKeys(r.Prior) {
		if err := r.parameter(&f, name); err != nil {
			return f, err
		}
	}
	if _, err := likelihood.NewSpace(f); err != nil {
		return f, r.Errorf("prior", "%v", err)
	}
	if len(f.Free) == 0 {
		return f, r.Errorf("prior", "no parameter is free; give at least one of them a prior")
	}
	return f, nil
}

func sortedKeys(m map[string]any) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

func (r *Run) radiation(f *likelihood.Family) error {
	const key = "universe.radiation"
	if r.Universe.Radiation == "from-temperature" {
		f.FromTemperature = true
		return nil
	}
	v, ok := number(r.Universe.Radiation)
	if !ok || !(v >= 0 && v <= 0.1) {
		return r.Errorf(key, "%s: found %v, expected \"from-temperature\" or a density parameter between 0 and 0.1", key, r.Universe.Radiation)
	}
	f.Radiation = v
	return nil
}

func (r *Run) parameter(f *likelihood.Family, name string) error {
	key := "prior." + name
	if !slices.Contains(likelihood.Names(), name) {
		return r.Errorf(key, "%q is not a parameter; the nearest is %q (the parameters are %s)", name,
			data.Nearest(name, likelihood.Names()), strings.Join(likelihood.Names(), ", "))
	}
	if v, ok := number(r.Prior[name]); ok {
		f.Fixed[name] = v
		if err := r.checkScale(name, v); err != nil {
			return err
		}
		return r.checkFixed(name, v)
	}
	spec, ok := r.Prior[name].(map[string]any)
	if !ok {
		return r.Errorf(key, "%s: found %v, expected a number or a prior such as { flat = [0, 1] }", key, r.Prior[name])
	}
	prior, err := r.prior(key, spec)
	if err != nil {
		return err
	}
	f.Free = append(f.Free, likelihood.Parameter{Name: name, Prior: prior})
	lo, hi := prior.Range()
	if err := r.checkScale(name, hi); err != nil {
		return err
	}
	if err := r.checkPossible(name, shapeOf(r.Prior[name]), lo, hi); err != nil {
		return err
	}
	return r.checkSane(name, lo, hi)
}

// shapeOf is the kind of prior that a parameter has.
func shapeOf(prior any) string {
	spec, _ := prior.(map[string]any)
	for _, k := range sortedKeys(spec) {
		if k != "within" {
			return k
		}
	}
	return ""
}

// sane bounds the parameters generously: beyond lies a slip of the pen or another
// unit, and arithmetic that overflows.
var sane = map[string][2]float64{
	"Om": {0, 100}, "OL": {-100, 100}, "H0": {0, 1e4}, "w0": {-50, 50}, "wa": {-50, 50},
}

func (r *Run) checkSane(name string, lo, hi float64) error {
	ends, ok := sane[name]
	if !ok || lo >= ends[0] && hi <= ends[1] {
		return nil
	}
	found := fmt.Sprintf("%g", lo)
	if lo != hi {
		found = fmt.Sprintf("a range of [%g, %g]", lo, hi)
	}
	return r.Errorf("prior."+name, "prior.%s: found %s, expected values between %g and %g; a normal prior takes its ends from within = [a, b]", name, found, ends[0], ends[1])
}

// checkFixed refuses a number that no universe can have.
func (r *Run) checkFixed(name string, v float64) error {
	switch {
	case v < 0 && name == "Om":
		return r.Errorf("prior.Om", "prior.Om: found %g; matter cannot have a negative density, give 0 or more", v)
	case v <= 0 && slices.Contains(positive, name):
		return r.Errorf("prior."+name, "prior.%s: found %g, expected a number above 0", name, v)
	}
	return r.checkSane(name, v, v)
}

// checkScale catches H0 given as h, and numbers that are none.
func (r *Run) checkScale(name string, v float64) error {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return r.Errorf("prior."+name, "prior.%s: found %v, expected a finite number", name, v)
	case name == "H0" && v > 0 && v < 10:
		return r.Errorf("prior.H0", "prior.H0: found %.4g, expected km/s/Mpc; this looks like h = H0/100, write %.4g", v, 100*v)
	}
	return nil
}

// positive lists the parameters that no universe has at or below zero.
var positive = []string{"H0", "hrd", "rd", "ob"}

func (r *Run) checkPossible(name, shape string, lo, hi float64) error {
	if hi <= 0 && (name == "Om" || slices.Contains(positive, name)) {
		return r.Errorf("prior."+name, "prior.%s: the range [%g, %g] excludes every universe; %s must be able to be positive", name, lo, hi, name)
	}
	if lo < 0 && name == "Om" && shape == "normal" {
		return r.Errorf("prior.Om", "prior.Om: the normal prior reaches down to %g, but matter cannot have a negative density; cut it, for example with within = [0, 1.5]", lo)
	}
	if lo < 0 && name == "Om" {
		return r.Errorf("prior.Om", "prior.Om: found a lower end of %g; matter cannot have a negative density, begin at 0", lo)
	}
	if lo <= 0 && slices.Contains(positive, name) {
		return r.Errorf("prior."+name, "prior.%s: found a lower end of %g, expected one above 0", name, lo)
	}
	return nil
}

// prior reads { flat = [a, b] } and its relatives.
func (r *Run) prior(key string, spec map[string]any) (likelihood.Prior, error) {
	shapes := []string{"flat", "normal", "log-flat"}
	var shape string
	for _, k := range sortedKeys(spec) {
		switch {
		case k == "within":
		case !slices.Contains(shapes, k):
			return likelihood.Prior{}, r.Errorf(key, "%s: unknown prior %q; the nearest is %q (known: flat, normal, log-flat, with within beside normal)", key, k, nearestShape(k, shapes))
		case shape != "":
			return likelihood.Prior{}, r.Errorf(key, "%s: found both %s and %s, expected one", key, shape, k)
		default:
			shape = k
		}
	}
	if shape == "" {
		return likelihood.Prior{}, r.Errorf(key, "%s: found no prior, expected { flat = [a, b] }, { normal = [mean, sd] } or { log-flat = [a, b] }", key)
	}
	a, b, err := r.pair(key+"."+shape, spec[shape])
	if err != nil {
		return likelihood.Prior{}, err
	}
	p, err := r.shape(key, shape, a, b, spec["within"])
	if err != nil {
		return p, r.Errorf(key, "%s: %s", key, strings.TrimPrefix(err.Error(), r.File+": "))
	}
	return p, nil
}

// nearestShape knows the other names of the normal distribution.
func nearestShape(name string, shapes []string) string {
	if strings.HasPrefix(strings.ToLower(name), "gauss") {
		return "normal"
	}
	return data.Nearest(name, shapes)
}

func (r *Run) shape(key, shape string, a, b float64, within any) (likelihood.Prior, error) {
	if within != nil && shape != "normal" {
		return likelihood.Prior{}, fmt.Errorf("within goes with normal; give the ends in %s itself", shape)
	}
	switch shape {
	case "flat":
		return likelihood.Flat(a, b)
	case "log-flat":
		return likelihood.LogFlat(a, b)
	}
	if within == nil {
		return likelihood.Normal(a, b)
	}
	lo, hi, err := r.pair(key+".within", within)
	if err != nil {
		return likelihood.Prior{}, fmt.Errorf("within expects two numbers, found %v", within)
	}
	return likelihood.Truncated(a, b, lo, hi)
}

func (r *Run) pair(key string, v any) (a, b float64, err error) {
	list, _ := v.([]any)
	if len(list) == 2 {
		x, okx := number(list[0])
		y, oky := number(list[1])
		if okx && oky {
			return x, y, nil
		}
	}
	return 0, 0, r.Errorf(key, "%s: found %v, expected two numbers in brackets", key, v)
}

func number(v any) (float64, bool) {
	switch x := v.(type) {
	case float64:
		return x, true
	case int64:
		return float64(x), true
	}
	return 0, false
}

// Offset reads the offset of the i-th table: "free" where none is given.
func (r *Run) Offset(i int) (likelihood.Offset, error) {
	key := fmt.Sprintf("data.%d.offset", i+1)
	switch v := r.Data[i].Offset.(type) {
	case nil:
		return likelihood.Offset{}, nil
	case string:
		if v == "absolute" {
			return likelihood.Offset{Kind: likelihood.AbsoluteOffset}, nil
		}
		return likelihood.Offset{}, r.oneOf(key, v, "free", "absolute")
	case map[string]any:
		mean, sd, err := r.pair(key+".normal", v["normal"])
		if err == nil && len(v) == 1 && sd > 0 {
			return likelihood.Offset{Kind: likelihood.NormalOffset, Mean: mean, SD: sd}, nil
		}
	}
	return likelihood.Offset{}, r.Errorf(key, "%s: found %v, expected \"free\", \"absolute\" or { normal = [mean, sd] } of M in mag, sd > 0", key, r.Data[i].Offset)
}
