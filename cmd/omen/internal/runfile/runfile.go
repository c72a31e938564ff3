// Package runfile reads the TOML file that describes a run, strictly: an unknown
// key, a wrong type or an impossible value is an [Error] that names the line and
// says what to write instead.
package runfile

import (
	"fmt"
	"path/filepath"
	"slices"
	"time"

	"github.com/pelletier/go-toml/v2"
)

// Run is a run file as the user wrote it, defaults filled in.
type Run struct {
	Title    string         `toml:"title,omitempty" comment:"shown above the result"`
	Universe Universe       `toml:"universe"`
	Prior    map[string]any `toml:"prior" comment:"name = { flat = [a, b] }, { normal = [mean, sd] }, { log-flat = [a, b] }, or a fixed number"`
	Data     []Data         `toml:"data"`
	Sampling Sampling       `toml:"sampling"`
	Fates    Fates          `toml:"fates"`

	File  string         `toml:"-"` // where it was read, for messages
	lines map[string]int // dotted key -> line
	sets  map[string]bool
}

// Universe is the family of universes to fit.
type Universe struct {
	Geometry         string `toml:"geometry" comment:"curved, or flat: OL follows from Om"`
	DarkEnergy       string `toml:"dark-energy" comment:"constant, w, or w0-wa"`
	Radiation        any    `toml:"radiation" comment:"from-temperature, or Or today (0: none)"`
	RequireBigBang   bool   `toml:"require-big-bang" comment:"leave out universes that bounced"`
	RequireMatterEra bool   `toml:"require-matter-era" comment:"w0-wa: leave out w0 + wa >= 0"`
}

// Data is one table of measurements.
type Data struct {
	Name            string            `toml:"name,omitempty"`
	Kind            string            `toml:"kind"`
	Table           string            `toml:"table"`
	Columns         map[string]string `toml:"columns,omitempty"`
	Keep            string            `toml:"keep,omitempty"`
	Covariance      string            `toml:"covariance,omitempty"`
	CovarianceHolds string            `toml:"covariance-holds,omitempty"`
	Templates       string            `toml:"templates,omitempty"`
	Offset          any               `toml:"offset,omitempty"`
	StandsFor       *StandsFor        `toml:"stands-for,omitempty"`
}

// StandsFor declares what a condensed table stands for.
type StandsFor struct {
	Rows int     `toml:"rows"`
	Chi2 float64 `toml:"chi2"`
}

// Sampling says how the posterior is explored and when it is enough.
type Sampling struct {
	Engine           string   `toml:"engine" comment:"chain, quadrature, or both: quadrature goes to 3 free parameters"`
	Seed             uint64   `toml:"seed"`
	Ensembles        int      `toml:"ensembles" comment:"independent of each other"`
	Walkers          int      `toml:"walkers" comment:"in each ensemble; 0 chooses by the number of parameters"`
	EffectiveSamples int      `toml:"effective-samples" comment:"the goal, for the slowest parameter"`
	MaxSteps         int      `toml:"max-steps"`
	MaxTime          Duration `toml:"max-time" comment:"such as 8h; 0s for no limit"`
	RecordEvery      int      `toml:"record-every" comment:"steps from one row of chain.csv to the next"`
	SyncInterval     Duration `toml:"sync-interval" comment:"how much work a power cut may undo"`
}

// Fates says how the fates are reckoned beyond the run's own family.
type Fates struct {
	Nested bool               `toml:"nested" comment:"compare with the simpler universes that the family contains"`
	Ahead  float64            `toml:"ahead" comment:"how far history.csv looks ahead, in units of 1/H0; 0 chooses by the best fit"`
	Odds   map[string]float64 `toml:"odds,omitempty" comment:"prior odds of the nested universes; those not named have 1"`
}

// Duration is a time.Duration written as in 90s or 8h30m.
type Duration time.Duration

// UnmarshalText reads a duration.
func (d *Duration) UnmarshalText(b []byte) error {
	v, err := time.ParseDuration(string(b))
	if err == nil && v < 0 {
		return fmt.Errorf("found %q, expected a positive duration such as 90s or 8h30m", b)
	}
	if err != nil {
		return fmt.Errorf("found %q, expected a duration such as 90s or 8h30m", b)
	}
	*d = Duration(v)
	return nil
}

// MarshalText writes a duration.
func (d Duration) MarshalText() ([]byte, error) { return []byte(time.Duration(d).String()), nil }

// Default is what a run file leaves unsaid.
func Default() Run {
	return Run{
		Universe: Universe{Geometry: "curved", DarkEnergy: "constant", Radiation: "from-temperature",
			RequireBigBang: true, RequireMatterEra: true},
		Fates: Fates{Nested: true},
		Sampling: Sampling{Engine: "both", Seed: 1, Ensembles: 4, EffectiveSamples: 4000, MaxSteps: 200_000,
			RecordEvery: 1, SyncInterval: Duration(3 * time.Second)},
	}
}

// Error is a mistake in a run file or in a --set.
type Error struct {
	File string
	Line int // 0 where no line is to blame
	Msg  string
}

func (e *Error) Error() string {
	if e.Line == 0 {
		return fmt.Sprintf("%s: %s", e.File, e.Msg)
	}
	return fmt.Sprintf("%s:%d: %s", e.File, e.Line, e.Msg)
}

// Errorf makes an Error that points at the line of a dotted key, or of the
// nearest table around it, or at the --set that gave it.
func (r *Run) Errorf(key, format string, args ...any) error {
	msg := fmt.Sprintf(format, args...)
	for k := key; k != ""; k = parent(k) {
		if r.sets[k] {
			return &Error{File: "--set " + key, Msg: msg}
		}
		if line := r.lines[k]; line > 0 {
			return &Error{File: r.File, Line: line, Msg: msg}
		}
	}
	return &Error{File: r.File, Msg: msg}
}

// Resolved writes the run with every default in its place and its paths
// relative to dir, where the text is to be kept.
func (r *Run) Resolved(dir string) ([]byte, error) {
	out := *r
	out.Data = slices.Clone(r.Data)
	for i := range out.Data {
		d := &out.Data[i]
		d.Table = r.relocate(d.Table, dir)
		d.Covariance = r.relocate(d.Covariance, dir)
		d.Templates = r.relocate(d.Templates, dir)
	}
	return toml.Marshal(out)
}

// relocate makes a path of the run file one that is good from dir, absolute
// where the two have no folder in common.
func (r *Run) relocate(path, dir string) string {
	if path == "" || filepath.IsAbs(path) {
		return path
	}
	from, err1 := filepath.Abs(dir)
	to, err2 := filepath.Abs(filepath.Join(filepath.Dir(r.File), path))
	if err1 != nil || err2 != nil {
		return path
	}
	rel, err := filepath.Rel(from, to)
	if err != nil {
		return to
	}
	return filepath.ToSlash(rel)
}
