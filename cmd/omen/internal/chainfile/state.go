package chainfile

import (
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// Schema names the version of run.json.
const Schema = "omen.run/1"

// Input is a file a run depends on.
type Input struct {
	Path   string `json:"path"`
	SHA256 string `json:"sha256"` // of its bytes, in hexadecimal
}

// Run is everything a chain is determined by. It never changes in the life
// of a run, and the checksums of the chain start from it.
type Run struct {
	Format     int      `json:"chain_format"`
	Seed       uint64   `json:"seed"`
	Ensembles  int      `json:"ensembles"`
	Walkers    int      `json:"walkers"` // of one ensemble
	Parameters []string `json:"parameters"`
	Every      int      `json:"every"`    // steps from one recorded step to the next
	RunFile    Input    `json:"run_file"` // as resolved, without the goals
	Inputs     []Input  `json:"inputs"`
}

// State is the content of run.json: the run and how far it is.
type State struct {
	Schema string `json:"schema"`
	Run
	Started  time.Time       `json:"started"`
	Seconds  float64         `json:"seconds"`      // spent sampling, over all sessions
	Step     int             `json:"synced_step"`  // the last recorded step that is safe
	Bytes    int64           `json:"synced_bytes"` // length of chain.csv up to there
	Finished bool            `json:"finished"`     // the goal was met
	Progress json.RawMessage `json:"progress,omitempty"`
}

// seal is the checksum every chain of this run starts from, header included.
func (r Run) seal() sum {
	b, err := json.Marshal(r.canonical())
	if err != nil {
		panic("chainfile: " + err.Error()) // Run holds nothing that can fail
	}
	return sum(0).add(b).next(r.header(), 0)
}

// canonical is the run as run.json gives it back: a path on disk may hold
// bytes that JSON cannot.
func (r Run) canonical() (c Run) {
	b, err := json.Marshal(r)
	if err == nil {
		err = json.Unmarshal(b, &c)
	}
	if err != nil {
		panic("chainfile: " + err.Error())
	}
	return c
}

func (r Run) check() error {
	if r.Ensembles < 1 || r.Walkers < 1 || r.Every < 1 || len(r.Parameters) == 0 {
		return fmt.Errorf("found %d ensembles of %d walkers with %d parameters, every %d steps: expected at least 1 of each",
			r.Ensembles, r.Walkers, len(r.Parameters), r.Every)
	}
	for _, name := range r.Parameters {
		if name == "" || strings.ContainsAny(name, ",\"\r\n") {
			return fmt.Errorf("found the parameter name %q, expected one without commas, quotes and line breaks", name)
		}
	}
	return nil
}

// ReadState reads run.json of the run in dir. It needs no lock: the file is
// replaced as a whole, so what is read was true at the last sync. The error
// wraps [fs.ErrNotExist] when dir holds no run.
func ReadState(dir string) (State, error) {
	path := filepath.Join(dir, StateName)
	b, err := os.ReadFile(path)
	if errors.Is(err, fs.ErrNotExist) {
		return State{}, fmt.Errorf("%s: no run in this folder (no %s): %w", dir, StateName, fs.ErrNotExist)
	}
	if err != nil {
		return State{}, err
	}
	s, err := parseState(b)
	if err != nil {
		return State{}, fmt.Errorf("%s: %w; restore the file from a copy, or start again in another folder", path, err)
	}
	return s, nil
}

func parseState(b []byte) (s State, err error) {
	if err := json.Unmarshal(b, &s); err != nil {
		return State{}, fmt.Errorf("found broken JSON (%w), expected the state of a run", err)
	}
	if s.Schema != Schema {
		return State{}, fmt.Errorf("found schema %q, expected %q", s.Schema, Schema)
	}
	if err := s.check(); err != nil {
		return State{}, err
	}
	if s.Step < 0 || s.Step%s.Every != 0 || s.Bytes < 0 {
		return State{}, fmt.Errorf("found synced step %d at byte %d, expected a multiple of %d", s.Step, s.Bytes, s.Every)
	}
	return s, nil
}

// writeState replaces run.json.
func writeState(dir string, s State) error {
	b, err := json.MarshalIndent(s, "", "  ")
	if err != nil {
		return err
	}
	return Replace(filepath.Join(dir, StateName), append(b, '\n'))
}

// temporary ends the name of a file that is not complete yet.
const temporary = ".new"

// Replace writes a file in one move: a reader, or whoever comes after a crash,
// finds the old content or the new, never a mixture.
func Replace(path string, content []byte) error {
	temp := path + temporary
	if err := writeSynced(temp, content); err != nil {
		os.Remove(temp)
		return err
	}
	if err := os.Rename(temp, path); err != nil {
		os.Remove(temp)
		return err
	}
	return syncDir(filepath.Dir(path))
}

func writeSynced(path string, b []byte) error {
	f, err := os.Create(path)
	if err != nil {
		return err
	}
	_, err = f.Write(b)
	return errors.Join(err, f.Sync(), f.Close())
}

// Change is one difference between two runs.
type Change struct {
	What    string // what differs, with the path of a file
	Was, Is string
}

// String is the difference in one line.
func (c Change) String() string {
	return fmt.Sprintf("%s: was %s, is now %s", c.What, c.Was, c.Is)
}

// Compare lists what keeps a chain of the run was from being continued as
// the run is: nothing when the two are the same.
func Compare(was, is Run) []Change {
	was, is = was.canonical(), is.canonical()
	var all []Change
	add := func(what string, was, is any) {
		if a, b := fmt.Sprint(was), fmt.Sprint(is); a != b {
			all = append(all, Change{what, a, b})
		}
	}
	add("chain-format version", was.Format, is.Format)
	add("seed", was.Seed, is.Seed)
	add("ensembles", was.Ensembles, is.Ensembles)
	add("walkers", was.Walkers, is.Walkers)
	add("parameters", strings.Join(was.Parameters, ", "), strings.Join(is.Parameters, ", "))
	add("steps between recorded steps", was.Every, is.Every)
	add("run file "+is.RunFile.Path, digest(was.RunFile.SHA256), digest(is.RunFile.SHA256))
	return append(all, compareInputs(was.Inputs, is.Inputs)...)
}

// compareInputs matches inputs by path and reports them in the order of was,
// then the new ones.
func compareInputs(was, is []Input) []Change {
	hash := make(map[string]string, len(is))
	for _, in := range is {
		hash[in.Path] = in.SHA256
	}
	var all []Change
	for _, in := range was {
		now, ok := hash[in.Path]
		delete(hash, in.Path)
		if !ok {
			all = append(all, Change{"input " + in.Path, digest(in.SHA256), "not read"})
		} else if now != in.SHA256 {
			all = append(all, Change{"input " + in.Path, digest(in.SHA256), digest(now)})
		}
	}
	for _, in := range is {
		if _, left := hash[in.Path]; left {
			all = append(all, Change{"input " + in.Path, "not read", digest(in.SHA256)})
			delete(hash, in.Path)
		}
	}
	return all
}

// digest is how a message shows a SHA-256: enough of it to tell two apart.
func digest(sha string) string {
	if len(sha) > 12 {
		sha = sha[:12] + "…"
	}
	return "SHA-256 " + sha
}
