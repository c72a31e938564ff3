package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

const goodTable = "name,z,mag,mag_err\na,0.1,19.0,0.1\nb,0.3,21.6,0.1\nc,0.5,22.9,0.1\nd,0.9,24.5,0.1\n"

const goodRun = `[prior]
Om = { flat = [0, 1] }
OL = { flat = [0, 1] }

[[data]]
kind = "supernovae"
table = "sn.csv"
`

// matrix is a 4×4 covariance with one element changed on one side or on both.
func matrix(i, j int, upper, lower string) string {
	var b strings.Builder
	b.WriteString("4\n")
	for r := range 4 {
		for c := range 4 {
			v := "0"
			switch {
			case r == i && c == j:
				v = upper
			case r == j && c == i:
				v = lower
			case r == c:
				v = "0.01"
			}
			b.WriteString(v + "\n")
		}
	}
	return b.String()
}

// Every mistake in a table, a covariance or a run file ends with one line that
// names file and line, says what was found and what to do, and with status 2;
// and leaves no folder behind.
func TestMistakesInFiles(t *testing.T) {
	withTable := func(table string) map[string]string { return map[string]string{"sn.csv": table} }
	withCov := func(cov string) map[string]string {
		return map[string]string{"sn.csv": goodTable, "c.cov": cov, "run.toml": goodRun + "covariance = \"c.cov\"\n"}
	}
	withRun := func(run string) map[string]string { return map[string]string{"sn.csv": goodTable, "run.toml": run} }
	swap := func(old, new string) string { return strings.Replace(goodTable, old, new, 1) }
	for _, c := range []struct {
		name  string
		files map[string]string
		want  []string // parts of the message, in order
	}{
		{"no such table", nil, []string{"run.toml:7: cannot read", "sn.csv: no such file", `; "sn.csv" is looked for from `, "the folder of the run file: correct the path"}},
		{"empty table", withTable(""), []string{"sn.csv", "empty"}},
		{"header only", withTable("name,z,mag,mag_err\n"), []string{"sn.csv", "no rows"}},
		{"missing column", withTable(swap("z,mag", "zHD,mag")), []string{`sn.csv:1: column "z"`, `the nearest is "zHD"`, `columns = { z = "zHD" }`}},
		{"text for a number", withTable(swap("21.6", "bright")), []string{`sn.csv:3: column "mag": found "bright"`, "expected"}},
		{"NaN", withTable(swap("21.6", "NaN")), []string{`sn.csv:3: column "mag": found NaN`}},
		{"Inf", withTable(swap("21.6", "inf")), []string{`sn.csv:3: column "mag": found inf`}},
		{"negative error", withTable(swap("22.9,0.1", "22.9,-0.1")), []string{`sn.csv:4: column "mag_err": found`, "-0.1", "above 0"}},
		{"zero error", withTable(swap("22.9,0.1", "22.9,0")), []string{`sn.csv:4: column "mag_err": found`, "above 0"}},
		{"zero redshift", withTable(swap("a,0.1", "a,0")), []string{`sn.csv:2: column "z": found`, "above 0"}},
		{"negative redshift", withTable(swap("a,0.1", "a,-0.1")), []string{`sn.csv:2: column "z": found`, "above 0"}},
		{"a velocity for a redshift", withTable(swap("a,0.1", "a,1e10")), []string{`sn.csv:2: column "z": found 1e10, expected a redshift below 2000`}},
		{"walkers beyond memory", withRun("[sampling]\nwalkers = 1000000000000\n" + goodRun), []string{"run.toml:2: sampling.walkers: found 1000000000000"}},
		{"header twice", withTable(swap("mag,mag_err", "mag,mag")), []string{`sn.csv:1: column "mag": found the name twice`, "rename"}},
		{"ragged row", withTable(swap("0.3,21.6,0.1", "0.3,21.6")), []string{"sn.csv:3", "3 cells", "4"}},
		{"a cut that keeps nothing", withRun(goodRun + "keep = \"z > 5\"\n"), []string{"run.toml:8: ", "sn.csv: found no row left", "z > 5"}},
		{"a cut on an unknown column", withRun(goodRun + "keep = \"zz > 0\"\n"), []string{"run.toml:8: ", `sn.csv:1: column "zz"`, `"z"`}},
		{"a cut that is none", withRun(goodRun + "keep = \"z >\"\n"), []string{"run.toml:8: ", `sn.csv: found the cut "z >"`}},
		{"a cut that fails on a row", withRun(goodRun + "keep = \"int(name) > 3\"\n"), []string{"run.toml:8: ", `sn.csv:2: found the cut "int(name) > 3"`}},
		{"a covariance of the wrong size", withCov("2\n1 0 0 1\n"), []string{"c.cov", "2×2", "4×4"}},
		{"a covariance that is not symmetric", withCov(matrix(1, 2, "0.001", "0.002")), []string{"c.cov:11", "0.002", "0.001", "symmetric"}},
		{"a covariance that is not positive definite", withCov(matrix(1, 2, "0.02", "0.02")), []string{"c.cov", "smallest eigenvalue -0.01", "b (", "c (", "positive definite"}},
		{"a covariance with text", withCov("4\n1 0 0 x\n"), []string{"c.cov:2", `"x"`}},
		{"no covariance file", withRun(goodRun + "covariance = \"gone.cov\"\n"), []string{"run.toml:8: cannot read", "gone.cov"}},
		{"a folder for a covariance", withRun(goodRun + "covariance = \".\"\n"), []string{"run.toml:8: cannot read", ": it is a folder; name a file in it"}},
		{"unknown key", withRun("[universe]\ngeometri = \"flat\"\n" + goodRun), []string{"run.toml:2", "geometri", `"geometry"`}},
		{"wrong type", withRun("[sampling]\nseed = \"x\"\n" + goodRun), []string{"run.toml:2", "sampling.seed"}},
		{"empty prior", withRun(strings.Replace(goodRun, "[0, 1]", "[1, 1]", 1)), []string{"run.toml:2", "empty"}},
		{"upside-down prior", withRun(strings.Replace(goodRun, "[0, 1]", "[1, 0]", 1)), []string{"run.toml:2", "lower end below its upper end"}},
		{"priors that exclude every universe", withRun(strings.Replace(goodRun, "OL = { flat = [0, 1] }", "OL = { flat = [50, 60] }", 1)), []string{"run.toml:1", "no universe within the priors can be observed as these data were; widen the priors, or check the errors and covariance of the tables"}},
		{"no data", withRun("[prior]\nOm = { flat = [0, 1] }\nOL = 0.7\n"), []string{"run.toml", "no data", "[[data]]"}},
		{"h for H0", withRun(strings.Replace(goodRun, "OL =", "H0 = 0.7\nOL =", 1)), []string{"run.toml:3", "found 0.7", "km/s/Mpc", "70"}},
		{"ages without H0", withRun(strings.Replace(goodRun, `kind = "supernovae"`, `kind = "ages"`, 1) + "columns = { age = \"mag\", error = \"mag_err\" }\n"), []string{"run.toml:1", "need H0"}},
	} {
		dir := t.TempDir()
		files := map[string]string{"run.toml": goodRun}
		for name, text := range c.files {
			files[name] = text
		}
		for name, text := range files {
			if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		out := filepath.Join(dir, "out")
		err := run(context.Background(), []string{"fit", "--quiet", "-o", out, filepath.Join(dir, "run.toml")}, &bytes.Buffer{}, &bytes.Buffer{})
		checkMistake(t, c.name, err, c.want)
		if _, err := os.Stat(out); err == nil {
			t.Errorf("%s: the output folder was made", c.name)
		}
	}
}

func checkMistake(t *testing.T, name string, err error, parts []string) {
	t.Helper()
	if status(err) != 2 {
		t.Errorf("%s: status %d (%v), want 2", name, status(err), err)
		return
	}
	rest := err.Error()
	for _, p := range parts {
		_, after, ok := strings.Cut(rest, p)
		if !ok {
			t.Errorf("%s:\n got %s\nwithout %q (in that order)", name, err, p)
			return
		}
		rest = after
	}
	if strings.Count(err.Error(), "\n") > 3 {
		t.Errorf("%s: a message of many lines:\n%s", name, err)
	}
}

func TestMistakesOnTheCommandLine(t *testing.T) {
	dir := t.TempDir()
	used := filepath.Join(dir, "used")
	if err := os.MkdirAll(filepath.Join(used, "x"), 0o755); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		args []string
		want []string
	}{
		{nil, []string{"name a command"}},
		{[]string{"fits"}, []string{`unknown command "fits"`, `"fit"`}},
		{[]string{"fit"}, []string{"expected 1 argument", "omen fit --help"}},
		{[]string{"fit", "--sede", "1", "x.toml"}, []string{"--sede"}},
		{[]string{"fit", filepath.Join(dir, "gone.toml")}, []string{"cannot read", "gone.toml", "omen new"}},
		{[]string{"fit", runsFile("fate.toml"), "-o", used}, []string{"used", "not empty", "-o"}},
		{[]string{"fit", runsFile("fate.toml"), "--set", "sampling.sead=1"}, []string{"sead", `"seed"`}},
		{[]string{"fate"}, []string{"--Om is missing"}},
		{[]string{"fate", "--Om", "0.3", "--H0", "0.7"}, []string{"--H0 0.7", "km/s/Mpc", "70"}},
		{[]string{"fate", "--Om", "-1"}, []string{"negative"}},
		{[]string{"fate", "--Om", "0.3", "--z", "-1"}, []string{"--z -1"}},
		{[]string{"fate", "--Om", "0.3", "--Or", "hot"}, []string{"--Or hot", "from-temperature"}},
		{[]string{"fate", "--Om", "NaN"}, []string{"Om"}},
		{[]string{"new", dir}, []string{"exists"}},
		{[]string{"new", ""}, []string{"the folder has no name"}},
		{[]string{"new", filepath.Join(dir, "n"), "--bao", dir}, []string{"not a file but a folder"}},
		{[]string{"new", filepath.Join(dir, "n"), "--covariance", "c.cov"}, []string{"without a table"}},
		{[]string{"new", filepath.Join(dir, "n"), "--supernovae", "gone.csv"}, []string{"cannot read gone.csv"}},
		{[]string{"new", filepath.Join(dir, "n"), "--supernovae", "gone.csv", "--covariance", "gone.cov"}, []string{"cannot read gone.cov"}},
		{[]string{"new", filepath.Join(dir, "n"), "--supernovae", "gone.csv", "--covariance", dir}, []string{"not a file"}},
		{[]string{"fit", runsFile("fate.toml"), "-o", ""}, []string{"-o names no folder"}},
		{[]string{"compare", dir, dir, "-o", ""}, []string{"-o names no folder"}},
		{[]string{"fit", runsFile("fate.toml"), "--threads", "-1"}, []string{"--threads -1", "1 or more"}},
		{[]string{"resume", dir, "--threads", "-1"}, []string{"--threads -1", "1 or more"}},
		{[]string{"inspect"}, []string{"expected 1 argument"}},
	} {
		err := run(context.Background(), c.args, &bytes.Buffer{}, &bytes.Buffer{})
		checkMistake(t, strings.Join(c.args, " "), err, c.want)
	}
}
