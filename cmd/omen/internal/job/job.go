// Package job makes a run file into something that can be computed: it reads the
// tables that the file names, keeps the hash of every input, and builds the
// posterior. It is the one place where files, data and likelihood meet.
package job

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"sync"
	"syscall"

	"omen/cmd/omen/internal/cache"
	"omen/cmd/omen/internal/runfile"
	"omen/data"
	"omen/likelihood"

	"gonum.org/v1/gonum/mat"
)

// Input is a file that a run depends on.
type Input struct {
	Path   string `json:"path"`
	SHA256 string `json:"sha256"`
}

// Table is one [[data]] table as it was read. Exactly one of the pointers to
// measurements is set.
type Table struct {
	Spec       runfile.Data
	Name       string // the user's name for it, or the file's
	Supernovae *data.Supernovae
	BAO        *data.BAO
	Ages       *data.Ages
	Rates      *data.Rates
	Matrix     *data.Matrix  // as in the file, nil where there is none
	Covariance *mat.SymDense // total and cut, nil where rows are independent

	Systematics []string // the names of its templates, none where it has no file of them
	Term        likelihood.Term
}

// Job is a run with everything that it needs.
type Job struct {
	Run       *runfile.Run
	Inputs    []Input
	Tables    []Table
	Space     *likelihood.Space
	Posterior *likelihood.Posterior

	cache   *cache.Cache
	keeping sync.WaitGroup // what is still being written to the cache
	whole   bool           // matrices stay in memory, to be looked at
}

// Load reads the tables of a run and all that belongs to them. Paths are relative
// to the run file.
func Load(run *runfile.Run) (*Job, error) { return load(&Job{Run: run, whole: true}) }

// LoadToFit is Load for a run that will be computed and not looked at: its Tables
// have no Matrix and no Covariance. What takes long is taken from c where it has
// been computed before; nil is no cache. No number depends on it.
func LoadToFit(run *runfile.Run, c *cache.Cache) (*Job, error) {
	return load(&Job{Run: run, cache: c})
}

func load(j *Job) (*Job, error) {
	defer j.keeping.Wait()
	family, err := j.Run.Family()
	if err != nil {
		return nil, err
	}
	if j.Space, err = likelihood.NewSpace(family); err != nil {
		return nil, j.Run.Errorf("prior", "%v", err)
	}
	var terms []likelihood.Term
	for i := range j.Run.Data {
		t, err := j.table(i)
		if err != nil {
			return nil, err
		}
		j.Tables = append(j.Tables, *t)
		terms = append(terms, t.Term)
	}
	if j.Posterior, err = likelihood.NewPosterior(j.Space, terms...); err != nil {
		return nil, j.Run.Errorf("prior", "%v", err)
	}
	return j, nil
}

// table reads the i-th table with its covariance and builds its term.
func (j *Job) table(i int) (*Table, error) {
	spec := j.Run.Data[i]
	t := &Table{Spec: spec, Name: spec.Name}
	if t.Name == "" {
		t.Name = filepath.Base(spec.Table)
	}
	key := fmt.Sprintf("data.%d", i+1)
	sum := j.ahead(key+".covariance", spec.Covariance)
	err := j.open(key+".table", spec.Table, t.read)
	if _, ok := errors.AsType[*data.CutError](err); ok {
		return nil, j.Run.Errorf(key+".keep", "%v", err)
	}
	if err != nil {
		return nil, err
	}
	noise, name, err := j.noise(key, t, sum)
	if err != nil {
		return nil, err
	}
	return t, j.term(i, t, noise, name)
}

// open hands a file to read and records its hash.
func (j *Job) open(key, name string, read func(io.Reader, string) error) error {
	path := j.Path(name)
	f, err := os.Open(path)
	if err != nil {
		return j.unreadable(key, name, err)
	}
	defer f.Close()
	sum := newDigest()
	defer sum.Close()
	tee := io.TeeReader(f, sum)
	plain, err := data.Decompress(tee)
	if err != nil {
		return j.unreadable(key, name, err)
	}
	if err := read(plain, path); err != nil {
		return err
	}
	if _, err := io.Copy(io.Discard, tee); err != nil {
		return err
	}
	j.Inputs = append(j.Inputs, Input{Path: path, SHA256: sum.hex()})
	return nil
}

// unreadable says of a file where it was looked for, and what to do: a folder that was
// moved takes along its run file, but not what that names.
func (j *Job) unreadable(key, name string, err error) error {
	path, err := j.Path(name), underlying(err)
	switch {
	case errors.Is(err, syscall.EISDIR):
		return j.Run.Errorf(key, "cannot read %s: it is a folder; name a file in it", path)
	case !errors.Is(err, fs.ErrNotExist):
		return j.Run.Errorf(key, "cannot read %s: %v", path, err)
	case filepath.IsAbs(name):
		return j.Run.Errorf(key, "cannot read %s: %v; correct the path, or put the file there", path, err)
	}
	dir := filepath.Dir(j.Run.File)
	if abs, err := filepath.Abs(dir); err == nil {
		dir = abs
	}
	return j.Run.Errorf(key, "cannot read %s: %v; %q is looked for from %s, the folder of the run file: correct the path, put the file there, or, if that folder was moved, move it back",
		path, err, name, dir)
}

// Path resolves a path of the run file.
func (j *Job) Path(name string) string {
	if filepath.IsAbs(name) {
		return name
	}
	return filepath.Join(filepath.Dir(j.Run.File), name)
}

func underlying(err error) error {
	if p, ok := err.(*os.PathError); ok {
		return p.Err
	}
	return err
}

// read fills in the measurements by kind.
func (t *Table) read(r io.Reader, file string) (err error) {
	o := data.Options{Columns: t.Spec.Columns, Cut: t.Spec.Keep}
	switch t.Spec.Kind {
	case "supernovae":
		t.Supernovae, err = data.ReadSupernovae(r, file, o)
	case "bao":
		t.BAO, err = data.ReadBAO(r, file, o)
	case "ages":
		t.Ages, err = data.ReadAges(r, file, o)
	case "rates":
		t.Rates, err = data.ReadRates(r, file, o)
	}
	return err
}

// Selection is which rows of the file were kept.
func (t *Table) Selection() data.Selection {
	switch {
	case t.Supernovae != nil:
		return t.Supernovae.Selection
	case t.BAO != nil:
		return t.BAO.Selection
	case t.Ages != nil:
		return t.Ages.Selection
	}
	return t.Rates.Selection
}

// Errors are the table's own errors, nil where it has none.
func (t *Table) Errors() []float64 {
	switch {
	case t.Supernovae != nil:
		return t.Supernovae.Err
	case t.BAO != nil:
		return t.BAO.Err
	case t.Ages != nil:
		return t.Ages.Err
	}
	return t.Rates.Err
}

// term builds the likelihood term of a table that has been read, with a noise and
// the name of the noise.
func (j *Job) term(i int, t *Table, noise likelihood.Noise, name cache.Key) (err error) {
	switch {
	case t.Supernovae != nil:
		err = j.supernovae(i, t, noise, name)
	case t.BAO != nil:
		t.Term, err = likelihood.NewBAO(t.BAO, noise)
	case t.Ages != nil:
		t.Term, err = likelihood.NewAges(t.Ages, noise)
	default:
		t.Term, err = likelihood.NewRates(t.Rates, noise)
	}
	if err != nil {
		return j.Run.Errorf(fmt.Sprintf("data.%d", i+1), "%s: %v", t.Name, err)
	}
	return nil
}

func (j *Job) supernovae(i int, t *Table, noise likelihood.Noise, name cache.Key) error {
	offset, err := j.Run.Offset(i)
	if err != nil {
		return err
	}
	var standing likelihood.Standing
	if s := t.Spec.StandsFor; s != nil {
		standing = likelihood.Standing{Rows: s.Rows, Chi2: s.Chi2}
	}
	sn, err := likelihood.NewSupernovae(t.Supernovae, noise, offset, standing)
	if err != nil {
		return err
	}
	if j.keeps(t) {
		sn.Remember(memory{j.cache, name})
	}
	t.Term = sn
	return nil
}

// Z are the redshifts of the kept rows.
func (t *Table) Z() []float64 {
	switch {
	case t.Supernovae != nil:
		return t.Supernovae.Z
	case t.BAO != nil:
		return t.BAO.Z
	case t.Ages != nil:
		return t.Ages.Z
	}
	return t.Rates.Z
}
