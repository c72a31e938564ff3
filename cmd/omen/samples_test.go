package main

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// sampleFile writes a sample of 12 rows; row makes the i-th.
func sampleFile(t *testing.T, header string, row func(i int) string) string {
	t.Helper()
	text := header + "\n"
	for i := range 12 {
		text += row(i) + "\n"
	}
	file := filepath.Join(t.TempDir(), "s.csv")
	if err := os.WriteFile(file, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return file
}

// What cannot be a universe, or a sample of them, is refused in the words of the flags.
func TestFateMistakes(t *testing.T) {
	rows := func(header, format string) string {
		return sampleFile(t, header, func(i int) string { return fmt.Sprintf(format, 0.3+0.001*float64(i*i%7)) })
	}
	short := filepath.Join(t.TempDir(), "short.csv")
	if err := os.WriteFile(short, []byte("Om\n0.3\n0.31\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	lone := sampleFile(t, "Om,weight", func(i int) string { return fmt.Sprintf("0.3%d,%g", i, max(1e-300, 1-float64(i))) })
	for _, c := range []struct{ args, want string }{
		{"--Om 0.3 --OL nan", "--OL NaN"},
		{"--Om nan", "--Om NaN"},
		{"--Om 101", "--Om 101"},
		{"--Om 0.3 --OL -101", "--OL -101"},
		{"--Om 0.3 --w0 nan", "--w0 NaN"},
		{"--Om 0.3 --wa -51", "--wa -51"},
		{"--Om 0.3 --H0 inf", "--H0 +Inf"},
		{"--Om 0.3 --H0 0.7", "write --H0 70"},
		{"--Om 0.3 --Or nan", "--Or nan"},
		{"--Om 0.3 --z 2e6", "--z 2e+06"},
		{"--Om 0.3 --z nan", "--z NaN"},
		{"--Om 0.3 --z ,", "expected redshifts such as"},
		{"--Om 0.3 --z a", "expected redshifts such as"},
		{"--samples " + short + " --columns Om=Om,Om=OL", "Om twice"},
		{"--samples " + short + " --columns Om=a,OL=a", "both Om and OL"},
		{"--samples " + short + " --columns Om=OL", "both Om and OL"},
		{"--samples " + short, "found 2 rows"},
		{"--samples " + rows("omega_m", "%g"), "--columns Om=omega_m"},
		{"--samples " + rows("Om,H0", "x%g,70"), "correct the cell, or remove the row"},
		{"--samples " + rows("Om,H0", "%g,0.7"), "s.csv:2: column \"H0\": found 0.7"},
		{"--samples " + rows("m,OL", "30%g,0.7") + " --columns Om=m", "percent"},
		{"--samples " + rows("Om,OL", "%g,170"), "s.csv:2: column \"OL\""},
		{"--samples " + rows("Om,OL,Ok", "%g,0.7,0.5"), "s.csv:2: found Ok = 0.5"},
		{"--samples " + rows("Om,weight", "%g,0"), "are worth 0 rows of equal weight (Kish), expected at least 10; is the column the right one? --columns weight=NAME"},
		{"--samples " + lone, "are worth 1 rows of equal weight"},
		{"--samples " + rows("Om,w0", "%g,-1e5"), "s.csv:2: column \"w0\": found -100000"},
		{"--samples " + rows("Om,wa", "%g,1e300"), "s.csv:2: column \"wa\": found 1e+300"},
		{"--samples " + rows("Om,Or", "%g,1e300"), "s.csv:2: column \"Or\": found 1e+300"},
		{"--samples " + rows("Om,Ok", "%g,1e300"), "s.csv:2: column \"Ok\": found 1e+300"},
		{"--samples=", "--samples names no file"},
		{"--samples " + rows("x,Om", "%g,0.3"), "same universe"},
	} {
		err := run(context.Background(), append([]string{"fate"}, strings.Fields(c.args)...), &bytes.Buffer{}, &bytes.Buffer{})
		if err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "strconv") || status(err) != 2 {
			t.Errorf("omen fate %s:\n got %v\nwant %s", c.args, err, c.want)
		}
	}
	if help := output(t, "fate", "--help"); strings.Contains(help, "NaN") || !strings.Contains(help, "0.5,1,2,3)") {
		t.Errorf("help shows other defaults:\n%s", help)
	}
}

// A column of one value is an assumption, no parameter.
func TestSampleFixedColumn(t *testing.T) {
	file := sampleFile(t, "Om,wa", func(i int) string { return fmt.Sprintf("%g,0.1", 0.3+0.001*float64(i*i%7)) })
	text := output(t, "fate", "--samples", file)
	if !strings.Contains(text, "wa = 0.1 in every row") || !strings.Contains(text, "w(a) = w0 + wa (1-a)") {
		t.Error(text)
	}
	if text := output(t, "fate", "--samples", file, "--w0", "-0.9"); !strings.Contains(text, "w0 = -0.9 in every row (--w0)") {
		t.Error(text)
	}
	percent := sampleFile(t, "Om", func(i int) string { return fmt.Sprint(30 + i*i%7) })
	if text := output(t, "fate", "--samples", percent); !strings.Contains(text, "percent") {
		t.Error(text)
	}
}

// What a message proposes can be typed as it stands.
func TestAsFlag(t *testing.T) {
	for _, c := range [][2]string{
		{"omega_m", "--columns Om=omega_m"},
		{"Ωm", "--columns Om=Ωm"},
		{"omega m", "--columns 'Om=omega m'"},
		{"a,b", `--columns '"Om=a,b"'`},
		{`the "m"`, `--columns '"Om=the ""m"""'`},
		{"it's", `--columns 'Om=it'\''s'`},
	} {
		if got := asFlag("Om", c[0]); got != c[1] {
			t.Errorf("asFlag(%q) = %s, expected %s", c[0], got, c[1])
		}
	}
}
