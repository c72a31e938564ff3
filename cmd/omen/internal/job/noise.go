package job

import (
	"crypto/sha256"
	"encoding/hex"
	"io"
	"os"
	"runtime"

	"omen/cmd/omen/internal/cache"
	"omen/data"
	"omen/likelihood"

	"gonum.org/v1/gonum/mat"
)

var roles = map[string]data.Role{"": data.Total, "total": data.Total, "added": data.Added, "inverse": data.Inverse}

// noise is that of a table that has been read; nil is its own errors.
func (j *Job) noise(key string, t *Table) (likelihood.Noise, error) {
	switch {
	case t.Spec.Covariance != "":
		u, err := j.factor(key+".covariance", t)
		if err != nil {
			return nil, err
		}
		return likelihood.Correlated(u), nil
	case t.Spec.Templates != "":
		return j.systematics(key+".templates", t)
	}
	return nil, nil
}

// systematics reads the templates of a table's systematic errors.
func (j *Job) systematics(key string, t *Table) (noise likelihood.Noise, err error) {
	var templates *data.Templates
	err = j.open(key, t.Spec.Templates, func(r io.Reader, file string) (err error) {
		templates, err = data.ReadTemplates(r, file, t.Selection())
		return err
	})
	if err != nil {
		return nil, err
	}
	if len(t.Errors()) == 0 {
		return nil, j.Run.Errorf(key, "%s has no column of errors; templates are added to errors, map the column", t.Spec.Table)
	}
	t.Systematics = templates.Names
	noise, err = likelihood.Systematics(t.Errors(), templates.Values, len(templates.Names))
	if err != nil {
		return nil, j.Run.Errorf(key, "%s: %v", t.Spec.Templates, err)
	}
	return noise, nil
}

// worthKeeping is the number of rows from which on a covariance takes longer to
// read and to factorise than a factor to look up.
const worthKeeping = 200

// factor is the Cholesky factor of a table's covariance: from the cache if the
// same one has been factorised before, from the file if not.
func (j *Job) factor(key string, t *Table) (*mat.TriDense, error) {
	n := len(t.Z())
	keeps := j.cache != nil && n >= worthKeeping
	if keeps {
		sum, err := j.sum(key, t.Spec.Covariance)
		if err != nil {
			return nil, err
		}
		if u := unpacked(j.cache, factorKey(t, sum), n); u != nil {
			j.Inputs = append(j.Inputs, Input{Path: j.Path(t.Spec.Covariance), SHA256: sum})
			return u, nil
		}
	}
	u, err := j.factorise(key, t)
	if err == nil && keeps {
		// The hash of what has been read: the file may have changed since the look
		// above. A cache that cannot be written is no reason to stop.
		_ = j.cache.Put(factorKey(t, j.Inputs[len(j.Inputs)-1].SHA256), packed(u))
	}
	return u, err
}

// sum is the SHA-256 of a file, in hexadecimal.
func (j *Job) sum(key, name string) (string, error) {
	path := j.Path(name)
	f, err := os.Open(path)
	if err != nil {
		return "", j.Run.Errorf(key, "cannot read %s: %v; paths are relative to the run file", path, underlying(err))
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.CopyBuffer(h, struct{ io.Reader }{f}, make([]byte, 1<<18)); err != nil {
		return "", j.Run.Errorf(key, "cannot read %s: %v", path, underlying(err))
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}

// factorise reads the covariance and factorises what the cut keeps of it.
func (j *Job) factorise(key string, t *Table) (*mat.TriDense, error) {
	err := j.open(key, t.Spec.Covariance, func(r io.Reader, file string) (err error) {
		t.Matrix, err = data.ReadMatrix(r, file)
		return err
	})
	if err != nil {
		return nil, err
	}
	c, u, err := data.Factorised(j.Path(t.Spec.Covariance), t.Matrix, roles[t.Spec.CovarianceHolds], t.Selection(), t.Errors())
	if err != nil {
		return nil, err
	}
	t.Covariance = c
	if !j.whole {
		t.Matrix, t.Covariance = nil, nil
	}
	return u, nil
}

// factorKey names all that a factor is computed from: the bytes of the matrix, the
// rows that are kept of it, and the errors that it is added to. Processors differ
// in the last bit.
func factorKey(t *Table, sum string) cache.Key {
	k := cache.NewKey("factor " + runtime.GOARCH)
	k.Text(sum)
	role := roles[t.Spec.CovarianceHolds]
	k.Number(uint64(role))
	s := t.Selection()
	k.Number(uint64(s.Read))
	k.Number(uint64(len(s.Kept)))
	for _, i := range s.Kept {
		k.Number(uint64(i))
	}
	if role == data.Added {
		k.Numbers(t.Errors())
	}
	return k.Key()
}

// packed is the upper triangle row by row.
func packed(u *mat.TriDense) []float64 {
	raw := u.RawTriangular()
	x := make([]float64, 0, raw.N*(raw.N+1)/2)
	for i := range raw.N {
		x = append(x, raw.Data[i*raw.Stride+i:i*raw.Stride+raw.N]...)
	}
	return x
}

// unpacked is the factor of n rows that a cache has, nil if it has none.
func unpacked(c *cache.Cache, key cache.Key, n int) *mat.TriDense {
	x, ok := c.Get(key)
	if !ok || len(x) != n*(n+1)/2 {
		return nil
	}
	u := mat.NewTriDense(n, mat.Upper, nil)
	raw := u.RawTriangular()
	for i := range n {
		x = x[copy(raw.Data[i*raw.Stride+i:(i+1)*raw.Stride], x):]
	}
	return u
}
