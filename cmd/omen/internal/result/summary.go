// Package result turns a chain into what a reader wants to know: constraints,
// derived quantities, the probability of each fate, the best fit, and warnings.
// Its [Summary] is what summary.json holds and what every report is made from.
package result

import (
	"encoding/json"
	"fmt"
	"math"
)

// Schema names the version of summary.json. Additions keep it; a changed meaning
// gets a new number.
const Schema = "omen.summary/1"

// Number is a float64 that JSON writes as null where it is NaN or infinite.
type Number float64

// MarshalJSON writes the shortest text that reads back the same.
func (n Number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(n)) || math.IsInf(float64(n), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(n))
}

// UnmarshalJSON reads null as NaN.
func (n *Number) UnmarshalJSON(b []byte) error {
	if string(b) == "null" {
		*n = Number(math.NaN())
		return nil
	}
	return json.Unmarshal(b, (*float64)(n))
}

// Summary is the result of a run. DEVELOPERS.md documents its JSON.
type Summary struct {
	Schema      string      `json:"schema"`
	Title       string      `json:"title"`
	Version     string      `json:"version"`
	Complete    bool        `json:"complete"` // false for a run that stopped before its goal
	Parameters  []Quantity  `json:"parameters"`
	Derived     []Quantity  `json:"derived"`
	Fates       []Fate      `json:"fates"`
	FatesHeldW  []Fate      `json:"fates_w_held,omitempty"` // with w kept at today's value, for w0-wa
	Today       []Fate      `json:"today"`                  // statements about the present: accelerating, closed
	Averaged    *Averaged   `json:"averaged,omitempty"`     // the same, averaged over the nested universes
	Nested      []Nested    `json:"nested,omitempty"`       // the nested universes, from the simplest on
	Priors      []Prior     `json:"other_priors,omitempty"` // the same under other priors, by reweighting
	Times       []Time      `json:"times,omitempty"`
	Fit         Fit         `json:"fit"`
	Engine      Engine      `json:"engine"`      // how the posterior was integrated
	Sampling    Sampling    `json:"sampling"`    // all zero where there is no chain
	Assumptions []string    `json:"assumptions"` // priors and what was taken for granted
	Warnings    []string    `json:"warnings"`
	Inputs      []InputFile `json:"inputs"`
}

// Quantity is one parameter or derived quantity, marginalised over the others.
type Quantity struct {
	Name       string    `json:"name"`
	Unit       string    `json:"unit"`
	Mean       Number    `json:"mean"`
	SD         Number    `json:"sd"`
	Median     Number    `json:"median"`
	Interval68 [2]Number `json:"interval68"` // central
	Interval95 [2]Number `json:"interval95"` // central
	HDI68      [2]Number `json:"hdi68"`      // highest density
	MCSE       Number    `json:"mcse"`       // Monte Carlo standard error of the mean
	MCSE68     [2]Number `json:"mcse68"`     // and of the ends of the intervals
	MCSE95     [2]Number `json:"mcse95"`
	ESS        Number    `json:"ess"`
	RHat       Number    `json:"rhat"`
	// Constrained is false where the marginal posterior is as wide as the prior.
	Constrained bool `json:"constrained"`
	// CutByPrior is true where an end of the prior's range cuts the posterior.
	CutByPrior bool `json:"cut_by_prior,omitempty"`

	mcseSD, mcseMedian float64
}

// Fate is the probability of a fate or of a statement, in [0, 1]. Where it was
// integrated, that is what stands here, and what the chain says stands beside it.
type Fate struct {
	Name        string `json:"name"`
	Probability Number `json:"probability"`
	Error       Number `json:"error"` // of the integral or Monte Carlo, null where the count is zero or all
	// Upper95 is the 95% upper limit where the probability is no more than known
	// to be small (it is then given as 0), or that of the opposite where it is given
	// as 1; else null.
	Upper95 Number `json:"upper95"`
	Exact   bool   `json:"exact"`           // by quadrature
	Chain   *Fate  `json:"chain,omitempty"` // what the chain says
}

// Averaged are probabilities averaged over the nested universes, each weighted with
// its own probability.
type Averaged struct {
	Fates      []Fate `json:"fates"`
	FatesHeldW []Fate `json:"fates_w_held,omitempty"`
	Today      []Fate `json:"today"`
}

// Nested is one of the universes that the run's family contains, as a model of its
// own. The constant that chi-squared lacks is the same for all of them.
type Nested struct {
	Name           string            `json:"name"` // as in the run file's [fates.odds]
	Words          string            `json:"words"`
	Own            bool              `json:"own"`        // the family of the run itself
	Parameters     int               `json:"parameters"` // free ones, marginalised offsets included
	Best           map[string]Number `json:"best"`
	Chi2           Number            `json:"chi2"`
	AIC            Number            `json:"aic"`
	BIC            Number            `json:"bic"`
	LogEvidence    Number            `json:"ln_evidence"`
	Error          Number            `json:"ln_evidence_error"`
	Method         string            `json:"method"`   // quadrature, bridge sampling, or point
	Admitted       Number            `json:"admitted"` // fraction of the prior with a big bang, over which it is normalised
	LogBayesFactor Number            `json:"ln_bayes_factor"`
	BayesError     Number            `json:"ln_bayes_factor_error"`
	Odds           Number            `json:"prior_odds"`
	Probability    Number            `json:"probability"`
	ProbabilityErr Number            `json:"probability_error"`
	Ruled          string            `json:"ruled_out,omitempty"` // why the data cannot be had in it at all
}

// Prior is another prior with the probabilities under it, by reweighting. It cannot
// look beyond the ranges of the run's own priors.
type Prior struct {
	Name      string    `json:"name"`      // "flat in (Om, q0)"
	Same      bool      `json:"same"`      // it is the run's own prior, but for what the ranges cut off
	Effective Number    `json:"effective"` // the smallest share of a sample that is left after reweighting
	Fates     []Fate    `json:"fates,omitempty"`
	Held      []Fate    `json:"fates_w_held,omitempty"`
	Today     []Fate    `json:"today,omitempty"`
	Averaged  *Averaged `json:"averaged,omitempty"`
}

// Time is when something happens, in those universes of the posterior in which it
// does.
type Time struct {
	Name        string    `json:"name"`
	Words       string    `json:"words"`
	Unit        string    `json:"unit"`        // Gyr; 1/H0 where H0 is not known; "" for a redshift
	Given       string    `json:"given"`       // the condition
	Probability Number    `json:"probability"` // of the condition
	Median      Number    `json:"median"`      // null where too few draws meet the condition
	Interval68  [2]Number `json:"interval68"`  // central
	Interval95  [2]Number `json:"interval95"`
	MCSE        Number    `json:"mcse"` // of the median; null for an integral
	ESS         Number    `json:"ess"`  // of the draws that meet the condition; null for an integral
}

// Engine is how the posterior was integrated.
type Engine struct {
	Name        string        `json:"name"`        // chain, quadrature, or both
	LogEvidence Number        `json:"ln_evidence"` // by quadrature; see Nested for the constant and the prior's volume
	Error       Number        `json:"ln_evidence_error"`
	Evaluations int           `json:"evaluations"` // of quadrature
	Seconds     float64       `json:"seconds"`
	Exact       []Quantity    `json:"exact,omitempty"`        // parameters and derived quantities by quadrature
	Largest     *Disagreement `json:"disagreement,omitempty"` // between chain and quadrature
}

// Disagreement is the largest difference between chain and quadrature, in units of the
// posterior width of the quantity.
type Disagreement struct {
	Quantity   string `json:"quantity"`
	Statistic  string `json:"statistic"` // mean, sd, median, or the end of an interval
	Widths     Number `json:"widths"`
	MonteCarlo Number `json:"monte_carlo"` // the chain's standard error of that statistic, likewise
	Sigmas     Number `json:"sigmas"`      // the largest difference in units of its own standard error, of any statistic
	Of         string `json:"sigmas_of"`
}

// Allowance is what a text says of the chain's own error, nothing if that is not known.
func (d *Disagreement) Allowance() string {
	if v := float64(d.MonteCarlo); v-v == 0 {
		return fmt.Sprintf(", its Monte Carlo error there being %.3f", v)
	}
	return ""
}

// Fit is the point of highest posterior density and how good it is.
type Fit struct {
	Chi2        Number            `json:"chi2"`
	DoF         int               `json:"dof"`
	Rows        int               `json:"rows"`
	Probability Number            `json:"probability"` // of a larger chi-squared by chance
	Best        map[string]Number `json:"best"`
	Tables      []TableFit        `json:"tables"`
}

// TableFit is the share of one table in the best fit.
type TableFit struct {
	Name string `json:"name"`
	Kind string `json:"kind"`
	Rows int    `json:"rows"`
	Chi2 Number `json:"chi2"`
}

// Sampling is how the posterior was explored.
type Sampling struct {
	Ensembles   int     `json:"ensembles"`
	Walkers     int     `json:"walkers"`
	Steps       int     `json:"steps"`
	BurnIn      int     `json:"burn_in"`
	Acceptance  Number  `json:"acceptance"`
	Evaluations int     `json:"evaluations"`
	Seconds     float64 `json:"seconds"`
	Seed        uint64  `json:"seed"`
	MinESS      Number  `json:"min_ess"`
	MaxRHat     Number  `json:"max_rhat"`
	Goal        int     `json:"goal"`

	// DirectShare is the fraction of the sample whose chi-squared was computed from
	// all rows, as the condensed form was not good enough. Left out if it is zero.
	DirectShare Number `json:"direct_share,omitempty"`
}

// InputFile is a file that the result depends on.
type InputFile struct {
	Path   string `json:"path"`
	SHA256 string `json:"sha256"`
}
