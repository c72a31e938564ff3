package job

import (
	"crypto/sha256"
	"encoding/hex"
	"io"
	"os"
	"runtime"
	"sync"

	"omen/cmd/omen/internal/cache"
	"omen/data"
	"omen/likelihood"

	"gonum.org/v1/gonum/mat"
)

var roles = map[string]data.Role{"": data.Total, "total": data.Total, "added": data.Added, "inverse": data.Inverse}

// noise is that of a table that has been read, nil if it is its own errors, with a
// name for it in the keys of the cache. sum is the hash of the covariance, if there
// is one and it may be in the cache.
func (j *Job) noise(key string, t *Table, sum func() (string, error)) (likelihood.Noise, cache.Key, error) {
	switch {
	case t.Spec.Covariance != "":
		return j.correlated(key+".covariance", t, sum)
	case t.Spec.Templates != "":
		return j.systematics(key+".templates", t)
	}
	k := cache.NewKey("errors")
	k.Numbers(t.Errors())
	return nil, k.Key(), nil
}

// systematics reads the templates of a table's systematic errors.
func (j *Job) systematics(key string, t *Table) (noise likelihood.Noise, name cache.Key, err error) {
	var templates *data.Templates
	err = j.open(key, t.Spec.Templates, func(r io.Reader, file string) (err error) {
		templates, err = data.ReadTemplates(r, file, t.Selection())
		return err
	})
	if err != nil {
		return nil, name, err
	}
	if len(t.Errors()) == 0 {
		return nil, name, j.Run.Errorf(key, "%s has no column of errors; templates are added to errors, map the column", t.Spec.Table)
	}
	t.Systematics = templates.Names
	noise, err = likelihood.Systematics(t.Errors(), templates.Values, len(templates.Names))
	if err != nil {
		return nil, name, j.Run.Errorf(key, "%s: %v", t.Spec.Templates, err)
	}
	k := cache.NewKey("templates")
	k.Text(j.last().SHA256)
	t.selected(k)
	k.Numbers(t.Errors())
	return noise, k.Key(), nil
}

// last is the input that was read last.
func (j *Job) last() Input { return j.Inputs[len(j.Inputs)-1] }

// worthKeeping is the number of rows from which on a covariance takes longer to
// read and to factorise than a factor to look up.
const worthKeeping = 200

// keeps says whether what is computed of a table is looked up, and kept.
func (j *Job) keeps(t *Table) bool { return j.cache != nil && len(t.Z()) >= worthKeeping }

// correlated is the noise of a table's covariance: from the cache if the same one
// has been factorised before, from the file if not. What the cache has is read here
// and found whole, but made a matrix only when it is needed, which is when
// chi-squared is summed over all rows.
func (j *Job) correlated(key string, t *Table, ahead func() (string, error)) (noise likelihood.Noise, name cache.Key, err error) {
	n := len(t.Z())
	if j.keeps(t) {
		sum, err := ahead()
		if err != nil {
			return nil, name, err
		}
		name = factorKey(t, sum)
		if x, ok := j.cache.Get(name); ok && len(x) == n*(n+1)/2 {
			j.Inputs = append(j.Inputs, Input{Path: j.Path(t.Spec.Covariance), SHA256: sum})
			return likelihood.Deferred(n, func() likelihood.Noise { return likelihood.Correlated(unpacked(x, n)) }), name, nil
		}
	}
	u, err := j.factorise(key, t)
	if err != nil {
		return nil, name, err
	}
	if j.keeps(t) {
		// The hash of what has been read: the file may have changed since the look
		// above. A cache that cannot be written is no reason to stop.
		name = factorKey(t, j.last().SHA256)
		j.keeping.Go(func() { _ = j.cache.Put(name, packed(u)) })
	}
	return likelihood.Correlated(u), name, nil
}

// ahead begins to compute the hash of a covariance that may be in the cache; the
// function it returns waits for it.
func (j *Job) ahead(key, name string) func() (string, error) {
	sum := sync.OnceValues(func() (string, error) { return j.sum(key, name) })
	if j.cache != nil && name != "" {
		go sum()
	}
	return sum
}

// sum is the SHA-256 of a file, in hexadecimal.
func (j *Job) sum(key, name string) (string, error) {
	path := j.Path(name)
	f, err := os.Open(path)
	if err != nil {
		return "", j.unreadable(key, name, err)
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
	t.selected(k)
	if role == data.Added {
		k.Numbers(t.Errors())
	}
	return k.Key()
}

// selected adds to a key which rows are kept.
func (t *Table) selected(k *cache.KeyWriter) {
	s := t.Selection()
	k.Number(uint64(s.Read))
	k.Number(uint64(len(s.Kept)))
	for _, i := range s.Kept {
		k.Number(uint64(i))
	}
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

// unpacked is the triangle of n rows that packed has taken x from.
func unpacked(x []float64, n int) *mat.TriDense {
	u := mat.NewTriDense(n, mat.Upper, nil)
	raw := u.RawTriangular()
	for i := range n {
		x = x[copy(raw.Data[i*raw.Stride+i:(i+1)*raw.Stride], x):]
	}
	return u
}
