package main

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"
)

// folder puts files into a new folder and returns it.
func folder(t *testing.T, files map[string]string) string {
	t.Helper()
	dir := t.TempDir()
	for name, text := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

func TestInspectCommittedRun(t *testing.T) {
	got := output(t, "inspect", runsFile("fate.toml"))
	for i, line := range strings.Split(got, "\n") {
		if utf8.RuneCountInString(line) > 80 {
			t.Errorf("line %d has more than 80 columns: %s", i+1, line)
		}
	}
	golden(t, "inspect.txt", got)
}

// What users of public releases stumble over is pointed at, and nothing else is.
func TestInspectLooksAt(t *testing.T) {
	const table = "name,z,z_hel,mag,mag_err\na,0.1,0.1001,19.0,0.1\nb,0.3,0.2999,21.6,0.1\nb,0.5,0.5001,22.9,0.1\nd,0.9,0.9001,24.5,0.1\n"
	cov := func(diagonal string) string {
		return "4\n" + strings.ReplaceAll("d 0 0 0\n0 d 0 0\n0 0 d 0\n0 0 0 d\n", "d", diagonal)
	}
	for _, c := range []struct {
		name, table, cov, holds string
		want                    string // "" for nothing to look at
	}{
		{"in order", table, cov("0.0100"), "", ""},
		{"errors above the covariance", table, cov("0.0004"), "", "the table's errors are larger than the covariance allows"},
		{"errors below the covariance", table, cov("0.0400"), "", "the table's errors differ from the covariance's"},
		{"added and total confused", table, cov("0.0000001"), "added", "was the total meant?"},
		{"added", table, cov("0.0100"), "added", ""},
		{"z copied into z_hel", strings.NewReplacer("0.1001", "0.1", "0.2999", "0.3", "0.5001", "0.5", "0.9001", "0.9").Replace(table), cov("0.01"), "", "was one copied into the other?"},
		{"z_hel of another column", strings.Replace(table, "0.5001", "0.4", 1), cov("0.01"), "", "are the columns the right ones?"},
	} {
		run := goodRun + "covariance = \"c.cov\"\n"
		if c.holds != "" {
			run += "covariance-holds = \"" + c.holds + "\"\n"
		}
		dir := folder(t, map[string]string{"run.toml": run, "sn.csv": c.table, "c.cov": c.cov})
		got := strings.Join(strings.Fields(output(t, "inspect", filepath.Join(dir, "run.toml"))), " ")
		if c.want == "" && strings.Contains(got, "look at") || !strings.Contains(got, c.want) {
			t.Errorf("%s: want %q to look at in\n%s", c.name, c.want, got)
		}
		if !strings.Contains(got, "1 name in 2 rows: b (2)") {
			t.Errorf("%s: the repeated name is not listed in\n%s", c.name, got)
		}
	}
}

// A new folder can be inspected and fitted as it is; its run file is commented.
func TestNewIsReadyToFit(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "first look")
	file := filepath.Join(dir, "first look.toml")
	if got := output(t, "new", dir); !strings.Contains(got, "is ready") {
		t.Error(got)
	}
	if got := output(t, "inspect", file); !strings.Contains(got, "152 kept of 152") {
		t.Error(got)
	}
	if s := fit(t, file); !s.Complete || len(s.Parameters) != 2 {
		t.Errorf("%+v", s)
	}
}

// Columns of public releases are recognised, and what is missing is said.
func TestNewRecognisesColumns(t *testing.T) {
	dir := folder(t, map[string]string{
		"sn.dat":  "#name zcmb zhel mb dmb\na 0.1 0.101 19.0 0.1\nb 0.3 0.301 21.6 0.1\n",
		"bao.csv": "z_eff,observable,value,err\n0.5,DM_over_rd,13.4,0.2\n0.7,DM_over_rd,17.3,0.2\n0.9,DH_over_rd,17.6,0.2\n",
		"odd.csv": "when,what\n0.1,19\n",
	})
	at := func(name string) string { return filepath.Join(dir, name) }
	output(t, "new", at("both"), "--supernovae", at("sn.dat"), "--bao", at("bao.csv"))
	text, err := os.ReadFile(filepath.Join(dir, "both", "both.toml"))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{
		`table = "../sn.dat"`, `columns = { z = "zcmb", z_hel = "zhel", mag = "mb", mag_err = "dmb" }`,
		`table = "../bao.csv"`, `columns = { z = "z_eff", quantity = "observable", error = "err" }`, "\nhrd = { flat",
	} {
		if !strings.Contains(string(text), want) {
			t.Errorf("no %q in\n%s", want, text)
		}
	}
	output(t, "inspect", filepath.Join(dir, "both", "both.toml"))

	got := output(t, "new", at("odd"), "--supernovae", at("odd.csv"))
	for _, want := range []string{"odd.toml is written, but not complete", "No column of ../odd.csv was recognised as z", "(it has "} {
		if !strings.Contains(got, want) {
			t.Errorf("no %q in\n%s", want, got)
		}
	}
	err = run(context.Background(), []string{"fit", filepath.Join(dir, "odd", "odd.toml")}, &bytes.Buffer{}, &bytes.Buffer{})
	checkMistake(t, "unrecognised columns", err, []string{"odd.csv:1", "no such column"})
}

// Whatever files, folders and columns are called, the new run file is one.
func TestNewQuotes(t *testing.T) {
	dir := folder(t, map[string]string{"a \"b\"": "zHD,mB,\"x\ny\"\n0.1,19,1\n", "c\\\x1b\n\"": "z,mag,mag_err\n0.1,19,0.1\n0.2,20.5,0.1\n"})
	for i, name := range []string{"a \"b\"", "c\\\x1b\n\""} {
		mine := filepath.Join(dir, []string{"my \"run\"", "two\nlines"}[i])
		got := output(t, "new", mine, "--supernovae", filepath.Join(dir, name))
		if strings.Contains(got, "\x1b") || !strings.Contains(got, "omen fit '"+dir) {
			t.Errorf("%q said %q", name, got)
		}
		run, err := parseRun(filepath.Join(mine, filepath.Base(mine)+".toml"), nil)
		if err != nil {
			t.Errorf("%q: %v", name, err)
			continue
		}
		if run.Title != filepath.Base(mine) || run.Data[0].Table != "../"+name {
			t.Errorf("%q: title %q, table %q", name, run.Title, run.Data[0].Table)
		}
	}
}

// Names that would steer the terminal are shown, not obeyed.
func TestInspectPrintable(t *testing.T) {
	dir := folder(t, map[string]string{"run.toml": goodRun + "name = \"x\\u001b[2J\"\n",
		"sn.csv": strings.Replace(goodTable, "b,0.3", "\"b\n\x1b[2J\",0.3", 1)})
	got := output(t, "inspect", filepath.Join(dir, "run.toml"))
	if strings.Contains(got, "\x1b") || !strings.Contains(got, "x�[2J (supernovae)") || !strings.Contains(got, "b��[2J ") {
		t.Errorf("got %q", got)
	}
}
