package nested

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/sampler/quadrature"
)

// shape lists the parameters that decide whether a family admits a universe. H0
// decides with them only by way of the radiation from the CMB temperature, which
// moves the border by less than 1e-4: it is held at its prior's median.
var shape = []string{"Om", "OL", "w0", "wa"}

// Volume is ln of the fraction of a prior that its family admits, with its error:
// the fraction with a big bang, and for w0-wa with a matter era. The priors are
// normalised over it.
func Volume(ctx context.Context, space *likelihood.Space) (quadrature.Estimate, error) {
	f := space.Family()
	if !f.RequireBigBang && !(f.RequireMatterEra && f.DarkEnergy == likelihood.W0Wa) {
		return quadrature.Estimate{}, nil
	}
	v := volume{space: space}
	for i, p := range space.Free() {
		_, lo := p.Prior.Range()
		v.middle = append(v.middle, p.Prior.Quantile(0.5))
		if slices.Contains(shape, p.Name) && !math.IsNaN(lo) {
			v.at = append(v.at, i)
		}
	}
	switch len(v.at) {
	case 0:
		return quadrature.Estimate{}, nil
	case 1, 2, 3:
		return v.integral(ctx)
	}
	return v.count()
}

type volume struct {
	space  *likelihood.Space
	middle []float64 // of the priors
	at     []int     // the parameters that matter
}

// admits reports whether the family admits the universe whose parameters that
// matter are y.
func (v *volume) admits(x, y []float64, p *likelihood.Point) bool {
	copy(x, v.middle)
	for i, k := range v.at {
		x[k] = y[i]
	}
	v.space.Point(x, p)
	return v.space.Allows(&p.Universe)
}

func (v *volume) integral(ctx context.Context) (quadrature.Estimate, error) {
	free := v.space.Free()
	var lo, hi []float64
	for _, k := range v.at {
		a, b := free[k].Prior.Range()
		lo, hi = append(lo, a), append(hi, b)
	}
	density := func() quadrature.Density {
		x := make([]float64, len(free))
		var p likelihood.Point
		return func(y []float64) float64 {
			if !v.admits(x, y, &p) {
				return math.Inf(-1)
			}
			sum := 0.0
			for i, k := range v.at {
				sum += free[k].Prior.LogDensity(y[i])
			}
			return sum
		}
	}
	o := quadrature.DefaultOptions()
	o.Passes = 1
	if len(v.at) == 3 {
		o.Tolerance = 1e-4
	}
	r, err := quadrature.Integrate(ctx, quadrature.Problem{Density: density, Lo: lo, Hi: hi}, o)
	if err != nil {
		return quadrature.Estimate{}, fmt.Errorf("the volume of the prior: %w", err)
	}
	return r.LogEvidence, nil
}

// counted is how many points of the prior are looked at where there are too many
// parameters to integrate.
const counted = 1 << 18

// count looks at evenly spread points of the prior.
func (v *volume) count() (quadrature.Estimate, error) {
	var p likelihood.Point
	admitted := 0
	outlook.Spread(v.space, counted, func(x []float64) {
		v.space.Point(x, &p)
		if v.space.Allows(&p.Universe) {
			admitted++
		}
	})
	if admitted == 0 {
		return quadrature.Estimate{}, errors.New("the priors exclude every universe: none of those tried had a big bang; widen them")
	}
	share := float64(admitted) / counted
	// The discrepancy of such points falls almost as 1/n; n^(-3/4) allows for curved borders.
	return quadrature.Estimate{Value: math.Log(share), Err: math.Pow(counted, -0.75) / share}, nil
}
