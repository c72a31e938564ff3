package likelihood

import (
	"encoding/csv"
	"math"
	"path/filepath"
	"strconv"
	"testing"

	"omen/data"
)

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: got %.6f, want %.6f within %g", what, got, want, tolerance)
	}
}

// The best fits to the BAO ratios of DESI DR2 (arXiv:2503.14738), without
// radiation. Recomputed independently from the released mean and covariance, and
// from the printed Table IV; an independent text has the same chi-squared and best
// fits for the release.
func TestBAOBestFits(t *testing.T) {
	families := map[string]Family{
		"flat":   {Flat: true, Free: []Parameter{param(t, "Om", 0.01, 0.99), param(t, "hrd", 10, 1000)}},
		"curved": {Free: []Parameter{param(t, "Om", 0.01, 0.99), param(t, "OL", -0.5, 1.8), param(t, "hrd", 10, 1000)}, RequireBigBang: true},
		"w":      {Flat: true, DarkEnergy: W, Free: []Parameter{param(t, "Om", 0.01, 0.99), param(t, "w0", -3, 1), param(t, "hrd", 10, 1000)}},
		"w0-wa": {Flat: true, DarkEnergy: W0Wa, RequireMatterEra: true,
			Free: []Parameter{param(t, "Om", 0.01, 0.99), param(t, "w0", -3, 1), param(t, "wa", -3, 2), param(t, "hrd", 10, 1000)}},
	}
	start := map[string][]float64{"flat": {0.3, 100}, "curved": {0.3, 0.7, 100}, "w": {0.3, -1, 100}, "w0-wa": {0.35, -0.4, -2, 95}}
	released := filepath.Join(publicData(t), "desi-dr2", "desi-dr2-bao")
	printed := runsFile("desi-dr2-bao")
	for _, c := range []struct {
		family, table string
		chi2          float64
		at            []float64 // in the order Om, OL, w0, wa, hrd
		within        []float64
	}{
		{"flat", released, 10.27104, []float64{0.29746, 101.5398}, []float64{2e-5, 2e-3}},
		{"curved", released, 9.95368, []float64{0.29314, 1 - 0.29314 - 0.02252, 101.256}, []float64{2e-5, 4e-5, 2e-3}},
		{"w", released, 9.04105, []float64{0.29769, -0.91190, 99.751}, []float64{2e-5, 2e-5, 2e-3}},
		{"w0-wa", released, 5.61860, []float64{0.38661, -0.17884, -2.71667, 91.25}, []float64{2e-5, 2e-4, 5e-4, 1e-2}},
		{"flat", printed, 10.53863, []float64{0.29735, 101.5498}, []float64{2e-5, 2e-3}},
		{"curved", printed, 10.23050, []float64{0.29313, 1 - 0.29313 - 0.02186, 101.27}, []float64{2e-5, 4e-5, 0.1}},
		{"w", printed, 9.32424, []float64{0.29753, -0.91449, 99.8}, []float64{2e-5, 2e-5, 0.2}},
		{"w0-wa", printed, 5.81207, []float64{0.38617, -0.18328, -2.70548, 91.3}, []float64{2e-5, 2e-4, 5e-4, 0.1}},
	} {
		p := posterior(t, families[c.family], baoTerm(t, c.table+".csv", c.table+".cov"))
		x, chi2 := best(t, p, start[c.family])
		near(t, c.family+" "+filepath.Base(filepath.Dir(c.table))+" chi²", chi2, c.chi2, 2e-5)
		for i := range c.at {
			near(t, c.family+" "+p.Space().Free()[i].Name, x[i], c.at[i], c.within[i])
		}
	}
}

// The condensed table against the log-likelihoods that the Pantheon+ release
// (Brout et al. 2022) lists for 200 points of its own sample: M is a parameter
// there, and Or = 8.4e-5.
func TestPublishedLogLikelihoods(t *testing.T) {
	name := filepath.Join(publicData(t), "pantheonplus", "published-loglike.csv")
	rows, err := csv.NewReader(open(t, name)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	f := Family{Radiation: 8.4e-5, Free: []Parameter{param(t, "Om", 0, 1.5), param(t, "OL", -1, 2), param(t, "H0", 20, 150), param(t, "M", -25, -15)}}
	e := posterior(t, f, condensed(t, Offset{Kind: AbsoluteOffset})).Evaluator()
	worst, n := 0.0, 0
	for _, row := range rows[1:] {
		var v [6]float64
		for i := range v {
			if v[i], err = strconv.ParseFloat(row[i], 64); err != nil {
				t.Fatal(err)
			}
		}
		om, ol, h0, m, loglike := v[0], v[1]-8.4e-5, v[3], v[4], v[5]
		worst = math.Max(worst, math.Abs(e.Chi2([]float64{om, ol, h0, m})+2*loglike))
		n++
	}
	if n != 200 || worst > 0.06 {
		t.Errorf("worst difference in chi² over %d points is %.4f, want 200 points and at most 0.06", n, worst)
	}
	t.Logf("worst difference in chi² %.4f", worst)
}

// moments integrates a posterior with flat priors over a grid of midpoints and
// returns means, standard deviations and the lowest chi-squared of the grid.
func moments(p *Posterior, cells ...int) (mean, sd []float64, minimum float64) {
	lo, hi := p.Space().Box()
	e := p.Evaluator()
	x := make([]float64, len(lo))
	mean, sd = make([]float64, len(lo)), make([]float64, len(lo))
	var points [][]float64
	var lnp []float64
	top := math.Inf(-1)
	var walk func(i int)
	walk = func(i int) {
		if i == len(x) {
			if v := e.LogDensity(x); !math.IsInf(v, -1) {
				points, lnp, top = append(points, append([]float64(nil), x...)), append(lnp, v), math.Max(top, v)
			}
			return
		}
		for k := range cells[i] {
			x[i] = lo[i] + (hi[i]-lo[i])*(float64(k)+0.5)/float64(cells[i])
			walk(i + 1)
		}
	}
	walk(0)
	sum := 0.0
	for k, v := range lnp {
		w := math.Exp(v - top)
		sum += w
		for i, xi := range points[k] {
			mean[i] += w * xi
			sd[i] += w * xi * xi
		}
	}
	for i := range mean {
		mean[i] /= sum
		sd[i] = math.Sqrt(sd[i]/sum - mean[i]*mean[i])
	}
	prior := 0.0
	for i := range lo {
		prior -= math.Log(hi[i] - lo[i])
	}
	return mean, sd, -2 * (top - prior)
}

// Supernova constraints by integration over a grid, radiation as in the
// release (8.4e-5) where it says so.
func TestSupernovaConstraints(t *testing.T) {
	dir := publicData(t)
	const radiation = 8.4e-5
	condensedSN := condensed(t, Offset{})
	plotted := func() *Supernovae {
		name := filepath.Join(dir, "pantheonplus", "Pantheon+SH0ES.dat")
		sn := must[*data.Supernovae](t)(data.ReadSupernovae(open(t, name), name, data.Options{Cut: "zHD > 0.01",
			Columns: map[string]string{"z": "zHD", "z_hel": "zHEL", "mag": "m_b_corr", "mag_err": "m_b_corr_err_DIAG", "name": "CID"}}))
		return must[*Supernovae](t)(NewSupernovae(sn, nil, Offset{}, Standing{}))
	}()
	binned := func(systematics bool) *Supernovae {
		name := filepath.Join(dir, "pantheon2018", "lcparam_DS17f.txt")
		sn := must[*data.Supernovae](t)(data.ReadSupernovae(open(t, name), name, data.Options{
			Columns: map[string]string{"z": "zcmb", "z_hel": "zhel", "mag": "mb", "mag_err": "dmb"}}))
		if !systematics {
			return must[*Supernovae](t)(NewSupernovae(sn, nil, Offset{}, Standing{}))
		}
		c := covariance(t, filepath.Join(dir, "pantheon2018", "sys_DS17f.txt"), data.Added, sn.Selection, sn.Err)
		return must[*Supernovae](t)(NewSupernovae(sn, c, Offset{}, Standing{}))
	}
	for _, c := range []struct {
		name      string
		term      Term
		radiation float64
		box       []float64 // Om, and OL if curved
		cells     []int
		mean, sd  []float64
		chi2      float64
		tolerance float64 // on chi²: the grid's step
	}{
		// Reference values, data README: grid integration of the condensed table.
		{"condensed flat", condensedSN, radiation, []float64{0.2, 0.5}, []int{600}, []float64{0.3321}, []float64{0.0182}, 1402.92, 0.02},
		{"condensed curved", condensedSN, radiation, []float64{0, 0.7, 0, 1.2}, []int{160, 160}, []float64{0.294, 0.609}, []float64{0.054, 0.081}, 1402.42, 0.02},
		// The same place: the full table with its plotted errors.
		{"plotted errors, flat", plotted, radiation, []float64{0.25, 0.46}, []int{300}, []float64{0.3509}, []float64{0.0188}, 697.298, 0.001},
		// Recomputed independently from the 40-bin release of Scolnic et al. 2018
		// (ApJ 859:101), which prints 0.298 ± 0.022, and 0.319 ± 0.070, 0.733 ± 0.113.
		{"binned flat", binned(true), 0, []float64{0.2, 0.41}, []int{400}, []float64{0.2974}, []float64{0.0218}, 39.298, 0.001},
		{"binned flat, statistical", binned(false), 0, []float64{0.2, 0.36}, []int{400}, []float64{0.2845}, []float64{0.0126}, 49.738, 0.001},
		{"binned curved", binned(true), 0, []float64{0, 0.8, 0, 1.4}, []int{130, 130}, []float64{0.323, 0.744}, []float64{0.072, 0.115}, 39.103, 0.01},
	} {
		f := Family{Radiation: c.radiation, Flat: len(c.box) == 2, RequireBigBang: true, Free: []Parameter{param(t, "Om", c.box[0], c.box[1])}}
		if !f.Flat {
			f.Free = append(f.Free, param(t, "OL", c.box[2], c.box[3]))
		}
		mean, sd, chi2 := moments(posterior(t, f, c.term), c.cells...)
		near(t, c.name+" chi²", chi2, c.chi2, c.tolerance)
		for i := range c.mean {
			near(t, c.name+" mean", mean[i], c.mean[i], 0.02*c.sd[i])
			near(t, c.name+" sd", sd[i], c.sd[i], 0.02*c.sd[i])
		}
	}
}
