package inspect

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"

	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/job/jobtest"
)

// load puts files into a folder and reads the run file among them.
func load(t *testing.T, files map[string]string) *job.Job {
	t.Helper()
	dir := t.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	return jobtest.Load(t, filepath.Join(dir, "run.toml"))
}

const (
	prior      = "[universe]\ngeometry = \"flat\"\n[prior]\nOm = { flat = [0, 1] }\n"
	supernovae = prior + "[[data]]\nkind = \"supernovae\"\ntable = \"sn.csv\"\n"
	bao        = prior + "hrd = { flat = [50, 150] }\n[[data]]\nkind = \"bao\"\ntable = \"bao.csv\"\n"
	four       = "name,z,mag,mag_err\na,0.1,19.0,0.1\nb,0.3,21.6,0.1\nc,0.5,22.9,0.1\nd,0.9,24.5,0.1\n"
	many       = "s1,s2,s3,s4,s5,s6\n" + zeros + zeros + zeros + zeros
	zeros      = "0,0.01,0,0.02,0,0\n"
)

// What is said of a table, by what it holds.
func TestWrite(t *testing.T) {
	for _, c := range []struct {
		name, run   string
		files       map[string]string
		want, never []string
	}{
		{"a cut", supernovae + "keep = \"z > 0.2\"\n", map[string]string{"sn.csv": four},
			[]string{"3 kept of 4", "1 removed by z > 0.2", "none: rows are taken as independent", "0.3 … 0.9"}, []string{"repeated"}},
		{"one name twice", supernovae, map[string]string{"sn.csv": strings.Replace(four, "\nb,", "\na,", 1)},
			[]string{"1 name in 2 rows: a (2)"}, nil},
		{"names often repeated", supernovae, map[string]string{"sn.csv": "name,z,mag\n" + strings.Repeat("a,0.1,19\nb,0.2,20.6\nc,0.3,21.5\nd,0.4,22.3\ne,0.5,22.9\nf,0.6,23.3\n", 2),
			"sn.cov": "12\n" + identity(12)}, []string{"6 names in 12 rows: a (2), b (2), c (2), d (2), e (2), …"}, []string{"f (2)"}},
		{"z_hel equal in one row", supernovae, map[string]string{"sn.csv": "z,z_hel,mag,mag_err\n0.1,0.1,19,0.1\n0.3,0.301,21.6,0.1\n0.5,0.501,22.9,0.1\n"},
			[]string{"at most 0.00100, equal in 1 row\n"}, []string{"look at"}},
		{"z_hel in another unit", supernovae, map[string]string{"sn.csv": "z,z_hel,mag,mag_err\n0.1,0.1,19,0.1\n0.3,0.33,21.6,0.1\n"},
			[]string{"look at        a change of frame is about 0.002 at most", "columns the right ones?"}, nil},
		{"one template", supernovae + "templates = \"sys.csv\"\n", map[string]string{"sn.csv": four, "sys.csv": "dust\n0.01\n0.02\n0.01\n0.03\n"},
			[]string{"templates      1 in sys.csv: dust\n", "the errors squared, and the templates"}, []string{"independent"}},
		{"many templates", supernovae + "templates = \"sys.csv\"\n", map[string]string{"sn.csv": four, "sys.csv": many},
			[]string{"6 in sys.csv: s1, s2, s3, s4, s5, …"}, []string{"s6", "independent"}},
		{"a stand-in", supernovae + "stands-for = { rows = 1, chi2 = 2.5 }\n", map[string]string{"sn.csv": four},
			[]string{"1 measurement, chi² 2.5 more"}, nil},
		{"one ratio", bao, map[string]string{"bao.csv": "z,quantity,value,error\n0.5,DM_over_rd,13.4,0.2\n"},
			[]string{"1 kept of 1", "for 1 row, -1 degrees of freedom, at"}, nil},
		{"two ratios and a covariance", bao + "covariance = \"bao.cov\"\n", map[string]string{"bao.csv": "z,quantity,value,error\n0.5,DM_over_rd,13.4,0.2\n0.7,DH_over_rd,19.9,0.4\n0.9,DM_over_rd,21.5,0.3\n",
			"bao.cov": "3\n0.04 0 0\n0 0.16 0\n0 0 0.09\n"}, []string{"3 × 3 in the file, 3 × 3 kept", "condition number 4", "1.000 … 1.000", "1 degree of freedom"}, []string{"look at"}},
	} {
		c.files["run.toml"] = c.run
		if c.files["sn.cov"] != "" {
			c.files["run.toml"] += "covariance = \"sn.cov\"\n"
		}
		j := load(t, c.files)
		lo, hi := j.Space.Box()
		middle := make([]float64, len(lo))
		for i := range lo {
			middle[i] = (lo[i] + hi[i]) / 2
		}
		var b strings.Builder
		if err := Write(&b, j, middle); err != nil {
			t.Fatal(err)
		}
		for _, line := range strings.Split(b.String(), "\n") {
			if utf8.RuneCountInString(line) > 80 {
				t.Errorf("%s: more than 80 columns: %s", c.name, line)
			}
		}
		for _, want := range c.want {
			if !strings.Contains(b.String(), want) {
				t.Errorf("%s: no %q in\n%s", c.name, want, b.String())
			}
		}
		for _, never := range c.never {
			if strings.Contains(b.String(), never) {
				t.Errorf("%s: found %q in\n%s", c.name, never, b.String())
			}
		}
	}
}

// identity is a matrix row by row.
func identity(n int) string {
	var b strings.Builder
	for i := range n {
		for k := range n {
			if i == k {
				b.WriteString("0.01 ")
			} else {
				b.WriteString("0 ")
			}
		}
		b.WriteString("\n")
	}
	return b.String()
}
