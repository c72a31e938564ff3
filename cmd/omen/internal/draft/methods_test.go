package draft

import (
	"testing"

	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/runfile"
	"omen/data"
)

// A table in words: how many of what, and how its errors go together.
func TestTable(t *testing.T) {
	sn := func(n int, spec runfile.Data, systematics ...string) *job.Table {
		spec.Kind = "supernovae"
		return &job.Table{Spec: spec, Name: "mine", Supernovae: &data.Supernovae{Z: []float64{0.1, 0.5, 1.25}[:n]}, Systematics: systematics}
	}
	for _, c := range []struct {
		table *job.Table
		want  string
	}{
		{sn(1, runfile.Data{}), "mine (1 type Ia supernova at redshifts 0.1 to 0.1, with independent errors)"},
		{sn(3, runfile.Data{Covariance: "a.cov"}), "mine (3 type Ia supernovae at redshifts 0.1 to 1.25, with their full covariance)"},
		{sn(3, runfile.Data{StandsFor: &runfile.StandsFor{Rows: 90}, Keep: "z > 0"}),
			"mine (3 magnitudes in place of 90 type Ia supernovae at redshifts 0.1 to 1.25, with independent errors, rows with `z > 0`)"},
		{sn(2, runfile.Data{Templates: "my sys.csv"}, "dust"),
			"mine (2 type Ia supernovae at redshifts 0.1 to 0.5, with their own errors and 1 template of systematic errors (`my sys.csv`), each of an amplitude with a unit normal prior, marginalised analytically)"},
		{sn(2, runfile.Data{Templates: "sys.csv"}, "dust", "calibration"),
			"mine (2 type Ia supernovae at redshifts 0.1 to 0.5, with their own errors and 2 templates of systematic errors (`sys.csv`), each of an amplitude with a unit normal prior, marginalised analytically)"},
		{&job.Table{Spec: runfile.Data{Kind: "bao"}, Name: "one", BAO: &data.BAO{Z: []float64{0.5}}}, "one (1 BAO distance ratio at redshifts 0.5 to 0.5, with independent errors)"},
		{&job.Table{Spec: runfile.Data{Kind: "ages"}, Name: "old", Ages: &data.Ages{Z: []float64{0, 2}}}, "old (2 ages of old objects at redshifts 0 to 2, with independent errors)"},
	} {
		if got := table(c.table); got != c.want {
			t.Errorf("got\n%s\nexpected\n%s", got, c.want)
		}
	}
}
