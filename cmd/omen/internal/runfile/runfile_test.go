package runfile

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

const good = `[prior]
Om = { flat = [0, 1] }
OL = 0.7

[[data]]
kind = "supernovae"
table = "sn.csv"
`

// Every mistake is named with its line and a remedy.
func TestMistakes(t *testing.T) {
	for _, c := range []struct{ name, text, want string }{
		{"unknown key", "[universe]\ngeometri = \"flat\"\n" + good,
			`my.toml:2: unknown key "universe.geometri"; the nearest known one is "geometry" (known here: geometry, dark-energy, radiation, require-big-bang, require-matter-era)`},
		{"unknown key of a table", good + "covarience = \"c.cov\"\n", `my.toml:8: unknown key "data.covarience"; the nearest known one is "covariance"`},
		{"unknown section", good + "[priors]\n", `my.toml:8: unknown key "priors"; the nearest known one is "prior"`},
		{"wrong type", good + "[sampling]\nseed = \"one\"\n", `my.toml:9: sampling.seed`},
		{"bad duration", good + "[sampling]\nmax-time = \"soon\"\n", `my.toml:9: `},
		{"broken TOML", "[prior\n", `my.toml:1: `},
		{"a table for a run file", "z,mag\n0.1,20\n", `my.toml:1: expected '=' after key; expected a run file: TOML in UTF-8`},
		{"wrong word", "[universe]\ngeometry = \"round\"\n" + good, `my.toml:2: universe.geometry: found "round", expected one of curved, flat`},
		{"no data", "[prior]\nOm = { flat = [0, 1] }\nOL = 0.7\n", "my.toml: there are no data"},
		{"unknown parameter", "[prior]\nOmega_m = 0.3\n" + good[8:], `my.toml:2: "Omega_m" is not a parameter; the nearest is "Om"`},
		{"empty prior", strings.Replace(good, "[0, 1]", "[0.3, 0.3]", 1), "my.toml:2: prior.Om: a prior on [0.3, 0.3] is empty; write the number alone to hold the parameter fixed"},
		{"upside down", strings.Replace(good, "[0, 1]", "[1, 0]", 1), "my.toml:2: prior.Om: a prior needs its lower end below its upper end, found [1, 0]"},
		{"excludes every universe", strings.Replace(good, "[0, 1]", "[-2, -1]", 1), "my.toml:2: prior.Om: the range [-2, -1] excludes every universe"},
		{"negative matter", strings.Replace(good, "[0, 1]", "[-0.1, 1]", 1), "my.toml:2: prior.Om: found a lower end of -0.1; matter cannot have a negative density, begin at 0"},
		{"unknown prior", strings.Replace(good, "flat =", "uniform =", 1), `my.toml:2: prior.Om: unknown prior "uniform"`},
		{"not two numbers", strings.Replace(good, "[0, 1]", "[0]", 1), `my.toml:2: prior.Om.flat: found [0], expected two numbers in brackets`},
		{"h for H0", strings.Replace(good, "OL = 0.7", "OL = 0.7\nH0 = 0.7", 1), "my.toml:4: prior.H0: found 0.7, expected km/s/Mpc; this looks like h = H0/100, write 70"},
		{"h for H0 in a prior", strings.Replace(good, "OL = 0.7", "OL = 0.7\nH0 = { normal = [0.7, 0.01] }", 1), "my.toml:4: prior.H0: found 0.78, expected km/s/Mpc"},
		{"flat with OL", "[universe]\ngeometry = \"flat\"\n" + good, "OL follows from Om in a flat universe"},
		{"OL missing", strings.Replace(good, "OL = 0.7", "", 1), "OL is missing"},
		{"nothing free", strings.Replace(good, "{ flat = [0, 1] }", "0.3", 1), "my.toml:1: no parameter is free"},
		{"unknown kind", strings.Replace(good, "supernovae", "supernova", 1), `my.toml:6: data.1.kind: found "supernova", expected one of supernovae, bao, ages, rates; the nearest is "supernovae"`},
		{"no table", strings.Replace(good, "table =", "#", 1), "my.toml:5: no file is named"},
		{"templates and a covariance", good + "covariance = \"c.cov\"\ntemplates = \"s.csv\"\n", "my.toml:9: found both templates and a covariance, expected one"},
		{"offset of another kind", strings.Replace(good, "supernovae", "bao", 1) + "offset = \"free\"\n", "my.toml:5: offset and stands-for belong to supernovae"},
		{"bad offset", good + "offset = { normal = [-19.3, -1] }\n", "my.toml:8: data.1.offset: found"},
		{"odd walkers", good + "[sampling]\nwalkers = 33\n", "my.toml:9: sampling.walkers: found 33; expected an even number"},
		{"one ensemble", good + "[sampling]\nensembles = 1\n", "my.toml:9: sampling.ensembles: found 1; expected 2 to 64"},
		{"log-flat from zero", strings.Replace(good, "flat = [0, 1]", "log-flat = [0, 1]", 1), "my.toml:2: prior.Om: a log-flat prior needs a positive lower end, found 0"},
		{"within flat", strings.Replace(good, "[0, 1] }", "[0, 1], within = [0, 1] }", 1), "my.toml:2: prior.Om: within goes with normal"},
		{"far truncation", strings.Replace(good, "flat = [0, 1] }", "normal = [0.3, 0.01], within = [0.8, 0.9] }", 1), "my.toml:2: prior.Om: the range [0.8, 0.9] lies 50.0 standard deviations"},
		{"too many walkers", good + "[sampling]\nwalkers = 1000000000\n", `my.toml:9: sampling.walkers: found 1000000000; expected an even number up to 10000`},
		{"too many ensembles", good + "[sampling]\nensembles = 65\n", `my.toml:9: sampling.ensembles: found 65; expected 2 to 64`},
		{"too thin", good + "[sampling]\nrecord-every = 2000000\n", `my.toml:9: sampling.record-every: found 2000000; expected 1 to 1000000`},
		{"no samples", good + "[sampling]\neffective-samples = 0\n", `my.toml:9: sampling.effective-samples: found 0; expected at least 100`},
		{"radiation of NaN", "[universe]\nradiation = nan\n" + good, `my.toml:2: universe.radiation: found NaN, expected`},
		{"negative fixed matter", strings.Replace(strings.Replace(good, "{ flat = [0, 1] }", "-1", 1), "OL = 0.7", "OL = { flat = [0, 1] }", 1), `my.toml:2: prior.Om: found -1; matter cannot have a negative density`},
		{"too much matter", strings.Replace(good, "{ flat = [0, 1] }", "{ flat = [0, 200] }", 1), `my.toml:2: prior.Om: found a range of [0, 200], expected values between 0 and 100`},
		{"too much lambda", strings.Replace(good, "OL = 0.7", "OL = 1e300", 1), `my.toml:3: prior.OL: found 1e+300, expected values between -100 and 100`},
		{"a huge H0", strings.Replace(good, "OL = 0.7", "OL = 0.7\nH0 = 70000", 1), `my.toml:4: prior.H0: found 70000, expected values between 0 and 10000`},
		{"a negative H0", strings.Replace(good, "OL = 0.7", "OL = 0.7\nH0 = -70", 1), `my.toml:4: prior.H0: found -70, expected a number above 0`},
		{"a huge w0", "[universe]\ndark-energy = \"w\"\n" + strings.Replace(good, "OL = 0.7", "OL = 0.7\nw0 = -51", 1), `my.toml:6: prior.w0: found -51, expected values between -50 and 50`},
		{"gauss", strings.Replace(good, "{ flat = [0, 1] }", "{ gauss = [0.3, 0.1] }", 1), `my.toml:2: prior.Om: unknown prior "gauss"; the nearest is "normal"`},
		{"normal below no matter", strings.Replace(good, "{ flat = [0, 1] }", "{ normal = [0.3, 0.1] }", 1), `my.toml:2: prior.Om: the normal prior reaches down to -0.5, but matter cannot have a negative density; cut it, for example with within = [0, 1.5]`},
		{"no kind", strings.Replace(good, "kind =", "#", 1), `my.toml:5: the table has no kind; write one of kind = "supernovae", "bao", "ages", "rates"`},
		{"no measurements", good + "stands-for = { rows = 0, chi2 = 1 }\n", `my.toml:8: data.1.stands-for.rows: found 0`},
		{"an impossible chi2", good + "stands-for = { rows = 9, chi2 = nan }\n", `my.toml:8: data.1.stands-for.chi2: found NaN`},
		{"a negative chi2", good + "stands-for = { rows = 9, chi2 = -1.0 }\n", `my.toml:8: data.1.stands-for.chi2: found -1`},
		{"a fraction of samples", good + "[sampling]\neffective-samples = 1e3\n", `my.toml:9: sampling.effective-samples: found a float, expected a whole number`},
		{"a number for a word", good + "[sampling]\nengine = 1\n", `my.toml:9: sampling.engine: found an integer, expected text in quotation marks`},
		{"a word for a section", "universe = \"flat\"\n" + good, `my.toml:1: universe: found a string, expected a table of keys`},
		{"a negative seed", good + "[sampling]\nseed = -1\n", `my.toml:9: sampling.seed`},
		{"a number for a duration", good + "[sampling]\nmax-time = 90\n", `my.toml:9: sampling.max-time: found 90ns, expected a duration in quotation marks with its unit`},
		{"a negative duration", good + "[sampling]\nmax-time = \"-1h\"\n", `expected a positive duration`},
	} {
		_, err := Parse("my.toml", []byte(c.text), nil)
		var own *Error
		if !errors.As(err, &own) || !strings.HasPrefix(err.Error(), c.want) && !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s:\n got %v\nwant %s", c.name, err, c.want)
		}
	}
}

// Some editors begin a file with a mark that says it is UTF-8.
func TestByteOrderMark(t *testing.T) {
	if _, err := Parse("my.toml", []byte("\ufeff"+good), []string{"sampling.seed=7"}); err != nil {
		t.Error(err)
	}
}

func TestSettings(t *testing.T) {
	run, err := Parse("my.toml", []byte(good), []string{"sampling.seed=7", "prior.OL={ flat = [0, 1] }", "data.1.keep=z > 0.1", "universe.radiation=0"})
	if err != nil {
		t.Fatal(err)
	}
	if run.Sampling.Seed != 7 || run.Data[0].Keep != "z > 0.1" || run.Universe.Radiation != int64(0) {
		t.Errorf("settings did not arrive: %+v", run)
	}
	if f, err := run.Family(); err != nil || len(f.Free) != 2 {
		t.Errorf("OL did not become free: %v %v", f.Free, err)
	}
	for set, want := range map[string]string{
		"sampling.sead=7":     `--set sampling.sead=7: unknown key "sampling.sead"; the nearest known one is "seed"`,
		"seed":                "--set seed: found no key=value",
		"data.2.keep=z>1":     "--set data.2.keep=z>1: expected data.N.key with N from 1 to 1",
		"prior.H0=0.7":        "--set prior.H0: prior.H0: found 0.7, expected km/s/Mpc",
		"title.x=1":           "", // a new table where a string belongs
		"universe.geometry=x": `--set universe.geometry: universe.geometry: found "x"`,
	} {
		if _, err := Parse("my.toml", []byte(good), []string{set}); err == nil || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("--set %s:\n got %v\nwant %s", set, err, want)
		}
	}
}

// A setting of none takes a key away, so that one file serves two geometries.
func TestSettingRemoves(t *testing.T) {
	run, err := Parse("my.toml", []byte(good), []string{"prior.OL=none", "universe.geometry=flat"})
	if err != nil {
		t.Fatal(err)
	}
	if f, _ := run.Family(); !f.Flat || len(f.Fixed) != 0 {
		t.Errorf("got %+v", f)
	}
}

// The resolved file reads back as the same run, from wherever it is kept.
func TestResolvedReadsBack(t *testing.T) {
	files, err := filepath.Glob(filepath.Join("..", "..", "..", "..", "testdata", "runs", "*.toml"))
	if err != nil || len(files) == 0 {
		t.Fatal("no run files", err)
	}
	dir := t.TempDir()
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		run, err := Parse(file, text, nil)
		if err != nil {
			t.Fatal(err)
		}
		resolved, err := run.Resolved(dir)
		if err != nil {
			t.Fatal(err)
		}
		again, err := Parse(filepath.Join(dir, "run.toml"), resolved, nil)
		if err != nil {
			t.Fatalf("%s: %v\n%s", file, err, resolved)
		}
		for i := range run.Data {
			a, _ := filepath.Abs(filepath.Join(filepath.Dir(run.File), run.Data[i].Table))
			b, _ := filepath.Abs(filepath.Join(dir, again.Data[i].Table))
			if a != b {
				t.Errorf("%s: table %s became %s", file, a, b)
			}
			run.Data[i].Table, run.Data[i].Covariance = again.Data[i].Table, again.Data[i].Covariance
		}
		if diff := cmp.Diff(run, again, cmpopts.IgnoreUnexported(Run{}), cmpopts.IgnoreFields(Run{}, "File")); diff != "" {
			t.Errorf("%s (-file +resolved):\n%s", file, diff)
		}
	}
}

func FuzzParse(f *testing.F) {
	f.Add([]byte(good))
	f.Add([]byte("[prior]\nOm = { normal = [0.3, 0.1], within = [0, 1] }\n[[data]]\n[data.columns]\nz = \"zHD\"\n"))
	f.Add([]byte("title = 'x'\n[[data]]\nstands-for = { rows = 1590, chi2 = 1.5 }\noffset = { normal = [1, 2] }\n"))
	f.Fuzz(func(t *testing.T, text []byte) {
		_, err := Parse("fuzz.toml", text, nil)
		var own *Error
		if err != nil && !errors.As(err, &own) {
			t.Errorf("not an error of ours: %v", err)
		}
	})
}
