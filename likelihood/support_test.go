package likelihood

import (
	"io"
	"os"
	"path/filepath"
	"testing"

	"omen/data"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/optimize"
)

// publicData is the folder of public release tables, which are not part of the
// repository. Tests that need it skip without it, except in CI.
func publicData(t testing.TB) string {
	t.Helper()
	dir := os.Getenv("OMEN_PUBLIC_DATA")
	if dir == "" {
		dir = filepath.Join("..", "..", "shared", "data")
	}
	if _, err := os.Stat(dir); err != nil {
		if os.Getenv("CI") != "" {
			t.Fatalf("no public data in %s", dir)
		}
		t.Skipf("needs the public tables named in DEVELOPERS.md; put them in %s or set OMEN_PUBLIC_DATA", dir)
	}
	return dir
}

func runsFile(name string) string { return filepath.Join("..", "testdata", "runs", name) }

func open(t testing.TB, name string) io.Reader {
	t.Helper()
	f, err := os.Open(name)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { f.Close() })
	return f
}

func must[T any](t testing.TB) func(T, error) T {
	return func(v T, err error) T {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

// covariance reads a matrix and applies it to a table's rows.
func covariance(t testing.TB, name string, role data.Role, sel data.Selection, errs []float64) Noise {
	t.Helper()
	m := must[*data.Matrix](t)(data.ReadMatrix(open(t, name), name))
	return correlate(t, must[*mat.SymDense](t)(data.Covariance(name, m, role, sel, errs)))
}

// correlate is the noise of a covariance.
func correlate(t testing.TB, cov *mat.SymDense) Noise {
	t.Helper()
	var chol mat.Cholesky
	if !chol.Factorize(cov) {
		t.Fatal("the covariance is not positive definite")
	}
	return Correlated(chol.RawU().(*mat.TriDense))
}

// baoTerm is a table of BAO ratios with its covariance.
func baoTerm(t testing.TB, csv, cov string) *BAO {
	b := must[*data.BAO](t)(data.ReadBAO(open(t, csv), csv, data.Options{}))
	return must[*BAO](t)(NewBAO(b, covariance(t, cov, data.Total, b.Selection, b.Err)))
}

// condensed is the four-magnitude stand-in for Pantheon+.
func condensed(t testing.TB, offset Offset) *Supernovae {
	csv, cov := runsFile("pantheonplus-condensed.csv"), runsFile("pantheonplus-condensed.cov")
	sn := must[*data.Supernovae](t)(data.ReadSupernovae(open(t, csv), csv, data.Options{}))
	c := covariance(t, cov, data.Total, sn.Selection, sn.Err)
	return must[*Supernovae](t)(NewSupernovae(sn, c, offset, Standing{Rows: 1590, Chi2: 1392.704664}))
}

// param is a free parameter with a flat prior.
func param(t testing.TB, name string, lo, hi float64) Parameter {
	return Parameter{name, must[Prior](t)(Flat(lo, hi))}
}

func posterior(t testing.TB, f Family, terms ...Term) *Posterior {
	t.Helper()
	space := must[*Space](t)(NewSpace(f))
	return must[*Posterior](t)(NewPosterior(space, terms...))
}

// best minimises chi-squared from a start by repeated simplex searches.
func best(t testing.TB, p *Posterior, start []float64) (x []float64, chi2 float64) {
	t.Helper()
	e := p.Evaluator()
	problem := optimize.Problem{Func: func(x []float64) float64 { return -2 * e.LogDensity(x) }}
	x = start
	for range 6 {
		r, err := optimize.Minimize(problem, x, &optimize.Settings{Converger: &optimize.FunctionConverge{Absolute: 1e-10, Iterations: 200}}, &optimize.NelderMead{})
		if err != nil {
			t.Fatal(err)
		}
		x = r.X
	}
	return x, e.Chi2(x)
}
