// Package result turns a chain into what a reader wants to know: constraints,
// derived quantities, the probability of each fate, the best fit, and warnings.
// Its [Summary] is what summary.json holds and what every report is made from.
package result

import (
	"encoding/json"
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
	Fit         Fit         `json:"fit"`
	Sampling    Sampling    `json:"sampling"`
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
}

// Fate is the probability of a fate or of a statement, in [0, 1].
type Fate struct {
	Name        string `json:"name"`
	Probability Number `json:"probability"`
	Error       Number `json:"error"`   // Monte Carlo, null where the count is zero or all
	Upper95     Number `json:"upper95"` // 95% upper limit where no draw has this fate, else null
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
}

// InputFile is a file that the result depends on.
type InputFile struct {
	Path   string `json:"path"`
	SHA256 string `json:"sha256"`
}
