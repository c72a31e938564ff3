package evidence

import (
	"fmt"
	"math"
)

// Estimate is a number and its standard error.
type Estimate struct{ Value, Err float64 }

// AIC returns Akaike's information criterion, −2 ln L + 2k, of a best fit with k free parameters (Akaike 1974,
// IEEE Trans. Autom. Control 19:716).
func AIC(maxLogLikelihood float64, k int) float64 {
	return -2*maxLogLikelihood + 2*float64(k)
}

// BIC returns the Bayesian information criterion, −2 ln L + k ln n, for n data (Schwarz 1978, Ann. Statist.
// 6:461). NaN unless n > 0.
func BIC(maxLogLikelihood float64, k, n int) float64 {
	if n <= 0 {
		return math.NaN()
	}
	return -2*maxLogLikelihood + float64(k)*math.Log(float64(n))
}

// LogBayesFactor returns ln of the Bayes factor of a over b, from ln evidences with independent errors.
func LogBayesFactor(a, b Estimate) Estimate {
	return Estimate{a.Value - b.Value, math.Hypot(a.Err, b.Err)}
}

// Probabilities returns the probability of each model from ln evidences and prior odds (not negative, any
// scale; nil for equal odds). The errors are propagated to first order, dp_i = p_i Σ_j (δ_ij − p_j) dlnZ_j,
// the ln evidences being independent. An evidence of -Inf makes a model impossible.
func Probabilities(logEvidence []Estimate, odds []float64) ([]Estimate, error) {
	if odds != nil && len(odds) != len(logEvidence) {
		return nil, fmt.Errorf("%d prior odds for %d models: there must be one each", len(odds), len(logEvidence))
	}
	weight := make([]float64, len(logEvidence))
	largest := math.Inf(-1)
	for i, z := range logEvidence {
		weight[i] = z.Value
		if odds != nil {
			if !(odds[i] >= 0) || math.IsInf(odds[i], 1) {
				return nil, fmt.Errorf("prior odds of model %d are %g: they must be finite and not negative", i+1, odds[i])
			}
			weight[i] += math.Log(odds[i])
		}
		if math.IsNaN(weight[i]) || math.IsInf(weight[i], 1) {
			return nil, fmt.Errorf("ln evidence of model %d is %g: it cannot be compared", i+1, z.Value)
		}
		largest = math.Max(largest, weight[i])
	}
	if math.IsInf(largest, -1) {
		return nil, fmt.Errorf("none of the %d models is possible", len(logEvidence))
	}
	return probabilities(logEvidence, weight, largest), nil
}

func probabilities(logEvidence []Estimate, weight []float64, largest float64) []Estimate {
	var sum float64
	for i, w := range weight {
		weight[i] = math.Exp(w - largest)
		sum += weight[i]
	}
	p := make([]Estimate, len(weight))
	for i, w := range weight {
		p[i].Value = w / sum
	}
	for i := range p {
		var rest, v float64 // 1 − p_i summed from the others, or a probability near 1 would lose its error
		for j := range p {
			if j != i {
				rest += p[j].Value
				v += math.Pow(p[j].Value*finite(logEvidence[j].Err), 2)
			}
		}
		v += math.Pow(rest*finite(logEvidence[i].Err), 2)
		p[i].Err = p[i].Value * math.Sqrt(v)
	}
	return p
}

// finite ignores the error of an impossible model.
func finite(err float64) float64 {
	if math.IsNaN(err) || math.IsInf(err, 0) {
		return 0
	}
	return err
}

// LogSumExp returns ln Σ exp(x_i) without overflow; -Inf for none.
func LogSumExp(x ...float64) float64 {
	largest := math.Inf(-1)
	for _, v := range x {
		largest = math.Max(largest, v)
	}
	if math.IsInf(largest, 0) || math.IsNaN(largest) {
		return largest
	}
	var sum float64
	for _, v := range x {
		sum += math.Exp(v - largest)
	}
	return largest + math.Log(sum)
}
