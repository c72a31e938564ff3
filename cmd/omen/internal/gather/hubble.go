package gather

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/job"
	"omen/data"
	"omen/likelihood"
	"omen/model"
)

// hubbleNodes is at how many redshifts curves are tabulated.
const hubbleNodes = 160

// hubble is the distances that were measured with the best fit and its bands.
func (r *Run) hubble() (*Picture, error) {
	h := &hubble{run: r, eval: r.Job.Posterior.Evaluator()}
	for i := range r.Job.Tables {
		t := &r.Job.Tables[i]
		if _, ok := t.Term.(*likelihood.Supernovae); ok {
			h.supernovae = append(h.supernovae, i)
		}
		if t.BAO != nil {
			h.bao = append(h.bao, i)
		}
	}
	if len(h.supernovae)+len(h.bao) == 0 {
		return absent("no table holds distances"), nil
	}
	in, err := h.input()
	if err != nil {
		return nil, err
	}
	return &Picture{Caption: h.caption(), Alt: h.alt(in), draw: func(w figure.Width) (*figure.Figure, error) {
		return figure.DrawHubble(*in, w)
	}}, nil
}

// hubble is the work on one diagram.
type hubble struct {
	run             *Run
	eval            *likelihood.Evaluator
	supernovae, bao []int // tables
	z               []float64
	dm, dh          []float64
	zero            []float64 // zero points of the supernova tables at the best fit
}

func (h *hubble) input() (*figure.Hubble, error) {
	h.z = h.redshifts()
	path, err := model.NewPath(h.z)
	if err != nil {
		return nil, err
	}
	h.dm, h.dh = make([]float64, len(h.z)), make([]float64, len(h.z))
	in := &figure.Hubble{Unfinished: h.run.Unfinished(), Magnitude: h.magnitude()}
	best, err := h.points(in)
	if err != nil {
		return nil, err
	}
	quantities := h.quantities()
	at := h.curves(path, h.run.Best, best, quantities)
	bands := make([]band, len(at))
	for _, x := range h.run.scatter(bandDraws) {
		zero, ok := h.zeroPoint(x)
		if !ok {
			continue
		}
		for k, c := range h.curves(path, x, zero, quantities) {
			bands[k].x = h.z
			bands[k].curves = append(bands[k].curves, c)
		}
	}
	in.Model = bands[0].figure(at[0])
	for k, q := range quantities {
		in.BAO = append(in.BAO, figure.BAO{Points: h.ratios(q), Model: bands[k+1].figure(at[k+1])})
	}
	return in, nil
}

// redshifts is a grid over all data with room at either end.
func (h *hubble) redshifts() []float64 {
	lo, hi := math.Inf(1), 0.0
	for _, i := range append(append([]int(nil), h.supernovae...), h.bao...) {
		for _, z := range h.run.Job.Tables[i].Z() {
			lo, hi = min(lo, z), max(hi, z)
		}
	}
	margin := math.Pow(hi/lo, 0.05) * 1.08
	return grid(lo/margin, hi*margin, hubbleNodes, true)
}

// magnitude is the axis of the first table; all others are brought to its zero
// point.
func (h *hubble) magnitude() figure.Label {
	if len(h.supernovae) > 0 && h.run.Job.Tables[h.supernovae[0]].Supernovae.Absolute {
		return append(figure.Plain("distance modulus "), axis("mu")...)
	}
	return append(figure.Plain("magnitude "), axis("mag")...)
}

// points adds the supernovae with the best fit at each. It returns the zero point
// to which all of them are brought.
func (h *hubble) points(in *figure.Hubble) (zero float64, err error) {
	each, ok := h.eval.Predictions(h.run.Best)
	if !ok {
		return 0, fmt.Errorf("the best fit has no distances to the data")
	}
	for _, i := range h.supernovae {
		t := &h.run.Job.Tables[i]
		res := t.Term.(*likelihood.Supernovae).Residuals(&each[i])
		h.zero = append(h.zero, zeroOf(t.Supernovae, res, &each[i]))
		shift := h.zero[len(h.zero)-1] - h.zero[0]
		p := figure.Points{Name: figure.Plain(tableName(t)), Z: t.Supernovae.Z}
		for k, e := range sigmas(t, res) {
			p.Value = append(p.Value, res[k].Measured-shift)
			p.Best = append(p.Best, res[k].Predicted-shift)
			p.Err = append(p.Err, e)
		}
		in.Supernovae = append(in.Supernovae, p)
	}
	if len(h.zero) > 0 {
		zero = h.zero[0]
	}
	return zero, nil
}

// zeroOf is what a table adds to 5 log10[(1+z_hel) D_M] at the universe of p.
func zeroOf(sn *data.Supernovae, res []likelihood.Residual, p *likelihood.Prediction) float64 {
	zHel := sn.Z[0]
	if sn.ZHel != nil {
		zHel = sn.ZHel[0]
	}
	return res[0].Predicted - 5*math.Log10((1+zHel)*p.DM[0])
}

// zeroPoint is the zero point at another universe: that of the best fit and how
// far the tables, weighted by their rows, would rather have it.
func (h *hubble) zeroPoint(x []float64) (float64, bool) {
	each, ok := h.eval.Predictions(x)
	if !ok || len(h.supernovae) == 0 {
		return 0, ok
	}
	sum, n := 0.0, 0.0
	for k, i := range h.supernovae {
		t := &h.run.Job.Tables[i]
		zero := zeroOf(t.Supernovae, t.Term.(*likelihood.Supernovae).Residuals(&each[i]), &each[i])
		w := float64(t.Term.Rows())
		sum, n = sum+w*(zero-h.zero[k]), n+w
	}
	return h.zero[0] + sum/n, true
}

// curves is the magnitude and each ratio over the grid for one universe.
func (h *hubble) curves(path *model.Path, x []float64, zero float64, quantities []data.Quantity) [][]float64 {
	var p likelihood.Point
	h.run.Job.Space.Point(x, &p)
	path.Fill(p.Universe, h.dm, h.dh)
	out := make([][]float64, 1+len(quantities))
	for k := range out {
		out[k] = make([]float64, len(h.z))
		for i, z := range h.z {
			if k == 0 {
				out[k][i] = zero + 5*math.Log10((1+z)*h.dm[i])
			} else {
				out[k][i] = ratio(quantities[k-1], z, h.dm[i], h.dh[i], p.HRd)
			}
		}
	}
	return out
}

// ratio is a BAO quantity from distances in units of c/H0.
func ratio(q data.Quantity, z, dm, dh, hrd float64) float64 {
	unit := model.C / 100 / hrd
	switch q {
	case data.DMOverRd:
		return dm * unit
	case data.DHOverRd:
		return dh * unit
	case data.DVOverRd:
		return math.Cbrt(z*dm*dm*dh) * unit
	}
	return dm / dh
}

// quantities lists the ratios that were measured.
func (h *hubble) quantities() []data.Quantity {
	var out []data.Quantity
	for q := data.DMOverRd; q <= data.DMOverDH; q++ {
		for _, i := range h.bao {
			for _, v := range h.run.Job.Tables[i].BAO.Quantity {
				if v == q && (len(out) == 0 || out[len(out)-1] != q) {
					out = append(out, q)
				}
			}
		}
	}
	return out
}

// ratios are the measurements of one quantity in all tables.
func (h *hubble) ratios(q data.Quantity) figure.Points {
	p := figure.Points{Name: figure.Markup(map[data.Quantity]string{
		data.DMOverRd: "*D*_M/*r*_d", data.DHOverRd: "*D*_H/*r*_d", data.DVOverRd: "*D*_V/*r*_d", data.DMOverDH: "*D*_M/*D*_H"}[q])}
	each, _ := h.eval.Predictions(h.run.Best)
	for _, i := range h.bao {
		t := &h.run.Job.Tables[i]
		res := t.Term.(*likelihood.BAO).Residuals(&each[i])
		for k, e := range sigmas(t, res) {
			if t.BAO.Quantity[k] == q {
				p.Z, p.Value, p.Err = append(p.Z, res[k].Z), append(p.Value, res[k].Measured), append(p.Err, e)
				p.Best = append(p.Best, res[k].Predicted)
			}
		}
	}
	return p
}

// sigmas are the errors that residuals are in units of: those of the covariance,
// which need not be the table's.
func sigmas(t *job.Table, res []likelihood.Residual) []float64 {
	own := t.Errors()
	out := make([]float64, len(res))
	for i, r := range res {
		out[i] = (r.Measured - r.Predicted) / r.Sigmas
		if !(out[i] > 0) && own != nil { // a residual of exactly nothing
			out[i] = own[i]
		}
		if !(out[i] > 0) {
			out[i] = 0
		}
	}
	return out
}

// tableName is the name of a table, with what it stands for if that is more than
// its rows.
func tableName(t *job.Table) string {
	if s := t.Spec.StandsFor; s != nil && s.Rows > 0 {
		return fmt.Sprintf("%s: %s for %d", t.Name, digits.Count(len(t.Z()), "value"), s.Rows)
	}
	return t.Name
}

func (h *hubble) caption() string {
	var b strings.Builder
	b.WriteString("What was measured against redshift, with the best fit and the bands that hold 68% and 95% of the posterior at each redshift. ")
	if len(h.supernovae) > 0 {
		b.WriteString("Supernovae above, and their residuals from the best fit; ")
		b.WriteString("every universe is drawn with the zero point that fits it best. Errors are square roots of the covariance's diagonal. ")
	}
	if len(h.bao) > 0 {
		b.WriteString("BAO ratios are shown relative to the best fit: the transverse (M), Hubble (H) and averaged (V) distance over the sound horizon. ")
	}
	return strings.TrimSpace(b.String())
}

// alt says how well the points fit.
func (h *hubble) alt(in *figure.Hubble) string {
	f := h.run.Summary.Fit
	var parts []string
	for _, t := range f.Tables {
		parts = append(parts, fmt.Sprintf("%s, %s, chi-squared %.1f", t.Name, digits.Count(t.Rows, "row"), float64(t.Chi2)))
	}
	return fmt.Sprintf("Measured distances against redshift from %.3g to %.3g with the best fit. %s. In all chi-squared %.1f for %s.",
		h.z[0], h.z[len(h.z)-1], strings.Join(parts, "; "), float64(f.Chi2), digits.Count(f.DoF, "degree of freedom"))
}

// Outlier is a measurement that is far from the best fit.
type Outlier struct {
	Table, Name         string
	Line                int // of the file
	Z                   float64
	Measured, Predicted float64
	Sigmas              float64
}

// Outliers are the n measurements that are furthest from the best fit, in units
// of their own errors.
func (r *Run) Outliers(n int) []Outlier {
	each, ok := r.Job.Posterior.Evaluator().Predictions(r.Best)
	if !ok {
		return nil
	}
	var out []Outlier
	for i := range r.Job.Tables {
		t := &r.Job.Tables[i]
		term, ok := t.Term.(interface {
			Residuals(*likelihood.Prediction) []likelihood.Residual
		})
		if !ok {
			continue
		}
		for k, v := range term.Residuals(&each[i]) {
			out = append(out, Outlier{t.Name, rowName(t, k), t.Selection().Lines[k], v.Z, v.Measured, v.Predicted, v.Sigmas})
		}
	}
	slices.SortStableFunc(out, func(a, b Outlier) int { return cmp.Compare(math.Abs(b.Sigmas), math.Abs(a.Sigmas)) })
	return out[:min(n, len(out))]
}

// rowName is the name of an object or of what was measured.
func rowName(t *job.Table, k int) string {
	switch {
	case t.Supernovae != nil && t.Supernovae.Name != nil:
		return t.Supernovae.Name[k]
	case t.BAO != nil:
		return t.BAO.Quantity[k].String()
	case t.Ages != nil && t.Ages.Name != nil:
		return t.Ages.Name[k]
	}
	return ""
}
