package quadrature

import (
	"cmp"
	"fmt"
	"math"
	"slices"
)

// Nodes are weighted points that stand for the posterior: the sum of Weight·f is the posterior mean of f, to
// the accuracy of the integration for a smooth f.
type Nodes struct {
	X      []float64 // points, row-major
	Weight []float64 // posterior probability each stands for; sums to 1
	LogP   []float64 // ln p at each
	Class  []int     // the class of each; -1 for none

	dim     int
	classes int
	coarse  []float64 // the same from the embedded Gauss rule: the difference estimates the error
	half    []float64 // half the extent of the tile each stands for, row-major
}

func newNodes(dim, classes int, ref float64, raw []node) *Nodes {
	n := &Nodes{dim: dim, classes: classes}
	for i := range raw {
		r := &raw[i]
		p := math.Exp(r.logp - ref)
		n.X = append(n.X, r.x[:dim]...)
		n.half = append(n.half, r.half[:dim]...)
		n.Weight, n.coarse = append(n.Weight, r.w*p), append(n.coarse, r.coarse*p)
		n.LogP = append(n.LogP, r.logp)
		c := int(r.label)
		if c >= classes {
			c = -1
		}
		n.Class = append(n.Class, c)
	}
	normalise(n.Weight)
	normalise(n.coarse)
	return n
}

func normalise(w []float64) {
	var sum float64
	for _, v := range w {
		sum += v
	}
	for i := range w {
		w[i] /= sum
	}
}

// Len returns the number of nodes.
func (n *Nodes) Len() int { return len(n.Weight) }

// Dim returns the number of coordinates.
func (n *Nodes) Dim() int { return n.dim }

// At returns the i-th point: part of X, not a copy.
func (n *Nodes) At(i int) []float64 { return n.X[i*n.dim : (i+1)*n.dim] }

// Mean returns the posterior mean of g. Where g is NaN it is undefined, and the mean is conditional on its
// being defined; NaN when it is nowhere.
func (n *Nodes) Mean(g func(x []float64) float64) Estimate {
	var fine, coarse, fineMass, coarseMass float64
	for i, w := range n.Weight {
		if v := g(n.At(i)); !math.IsNaN(v) {
			fine, fineMass = fine+w*v, fineMass+w
			coarse, coarseMass = coarse+n.coarse[i]*v, coarseMass+n.coarse[i]
		}
	}
	m := fine / fineMass
	return Estimate{m, math.Abs(m - coarse/coarseMass)}
}

// Probability returns the probability of a class.
func (n *Nodes) Probability(class int) Estimate {
	return n.share(func(i int) bool { return n.Class[i] == class })
}

// share sums the weights of the nodes chosen.
func (n *Nodes) share(chosen func(i int) bool) Estimate {
	var fine, coarse float64
	for i, w := range n.Weight {
		if chosen(i) {
			fine, coarse = fine+w, coarse+n.coarse[i]
		}
	}
	return Estimate{fine, math.Abs(fine - coarse)}
}

// Reweight returns the nodes of the posterior under another prior, r being the ratio of the new prior to the
// old, and ln of the mean of r: what is to be added to ln evidence if both priors are normalised. r must be
// smooth within each class, finite and not negative. Points and tiles are shared with n.
func (n *Nodes) Reweight(r func(x []float64) float64) (*Nodes, Estimate, error) {
	m := *n
	m.Weight, m.coarse = slices.Clone(n.Weight), slices.Clone(n.coarse)
	m.LogP = slices.Clone(n.LogP)
	var fine, coarse float64
	for i := range m.Weight {
		f := r(n.At(i))
		if !(f >= 0) || math.IsInf(f, 1) {
			return nil, Estimate{}, fmt.Errorf("the ratio of priors is %g at %g: it must be finite and not negative", f, n.At(i))
		}
		m.Weight[i] *= f
		m.coarse[i] *= f
		m.LogP[i] += math.Log(f)
		fine, coarse = fine+m.Weight[i], coarse+m.coarse[i]
	}
	if !(fine > 0) {
		return nil, Estimate{}, fmt.Errorf("the ratio of priors vanishes wherever the posterior has mass")
	}
	normalise(m.Weight)
	normalise(m.coarse)
	return &m, Estimate{math.Log(fine), math.Abs(math.Log(fine / coarse))}, nil
}

// Select returns the nodes for which keep is true as a posterior of their own: conditional on a class, say.
func (n *Nodes) Select(keep func(x []float64, class int) bool) *Nodes {
	m := &Nodes{dim: n.dim, classes: n.classes}
	for i := range n.Weight {
		if keep(n.At(i), n.Class[i]) {
			m.take(n, i)
		}
	}
	normalise(m.Weight)
	normalise(m.coarse)
	return m
}

// Thin drops the lightest nodes of each class, those that hold less than the fraction lost of its mass
// together, for callers that pay per node.
func (n *Nodes) Thin(lost float64) *Nodes {
	budget := make([]float64, n.classes+1)
	for i, w := range n.Weight {
		budget[n.Class[i]+1] += lost * w
	}
	byWeight := make([]int, n.Len())
	for i := range byWeight {
		byWeight[i] = i
	}
	slices.SortStableFunc(byWeight, func(a, b int) int { return cmp.Compare(n.Weight[a], n.Weight[b]) })
	drop := make([]bool, n.Len())
	for _, i := range byWeight {
		b := &budget[n.Class[i]+1]
		if *b -= n.Weight[i]; *b < 0 {
			*b = 0
			continue
		}
		drop[i] = true
	}
	m := &Nodes{dim: n.dim, classes: n.classes}
	for i := range drop {
		if !drop[i] {
			m.take(n, i)
		}
	}
	normalise(m.Weight)
	normalise(m.coarse)
	return m
}

func (n *Nodes) take(from *Nodes, i int) {
	n.X = append(n.X, from.At(i)...)
	n.half = append(n.half, from.half[i*from.dim:(i+1)*from.dim]...)
	n.Weight = append(n.Weight, from.Weight[i])
	n.coarse = append(n.coarse, from.coarse[i])
	n.LogP = append(n.LogP, from.LogP[i])
	n.Class = append(n.Class, from.Class[i])
}
