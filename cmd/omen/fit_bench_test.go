//go:build unix

package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"syscall"
	"testing"
	"time"

	"omen/cmd/omen/internal/result"
	"omen/model"
)

// invented is a survey of n supernovae with twenty systematics as the text of a
// table, of templates and, if asked for, of an n×n matrix.
func invented(n int, matrix bool) (table, templates, cov bytes.Buffer) {
	const k = 20
	random := rand.New(rand.NewPCG(1, 2))
	amplitudes, f, errs := make([]float64, k), make([]float64, n*k), make([]float64, n)
	for s := range amplitudes {
		amplitudes[s] = random.NormFloat64()
		fmt.Fprintf(&templates, "%ss%d", separator(s), s)
	}
	fmt.Fprintln(&templates)
	fmt.Fprintln(&table, "name,z,z_hel,mag,mag_err")
	u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
	for i := range n {
		x := (float64(i) + random.Float64()) / float64(n)
		z := 0.01 + 2.25*x*x*x
		errs[i] = math.Round(1e4*(0.1+0.1*random.Float64())) * 1e-4
		m := u.DistanceModulus(z, z) - 19.3 + errs[i]*random.NormFloat64()
		for s, a := range amplitudes {
			t := math.Round(2e4*(math.Cos(float64(s)*math.Log1p(z))+0.3*random.NormFloat64())) * 1e-6
			f[i*k+s] = t
			m += a * t
			templates.WriteString(separator(s))
			templates.Write(strconv.AppendFloat(nil, t, 'f', 6, 64))
		}
		templates.WriteByte('\n')
		fmt.Fprintf(&table, "sn%d,%.6f,%.6f,%.5f,%.4f\n", i, z, z+0.0005*random.NormFloat64(), m, errs[i])
	}
	if matrix {
		covarianceText(&cov, f, errs)
	}
	return table, templates, cov
}

func separator(column int) string { return ","[:min(column, 1)] }

// covarianceText writes the size and then a number a line, as public releases do.
func covarianceText(cov *bytes.Buffer, f, errs []float64) {
	n := len(errs)
	k := len(f) / n
	fmt.Fprintln(cov, n)
	for i := range n {
		for j := range n {
			v := 0.0
			for s := range k {
				v += f[i*k+s] * f[j*k+s]
			}
			if i == j {
				v += errs[i] * errs[i]
			}
			fmt.Fprintf(cov, "%.8f\n", v)
		}
	}
}

// survey writes all that into a folder, with a run file.
func survey(b *testing.B, n int, matrix bool) (dir string) {
	dir = b.TempDir()
	table, templates, cov := invented(n, matrix)
	noise := `templates = "templates.csv"`
	if matrix {
		noise = `covariance = "sn.cov"`
	}
	run := "[universe]\nradiation = 0\n[prior]\nOm = { flat = [0, 1.5] }\nOL = { flat = [-0.5, 1.8] }\n" +
		"[[data]]\nkind = \"supernovae\"\ntable = \"sn.csv\"\nkeep = \"z > 0.01001\"\n" + noise + "\n[sampling]\neffective-samples = 10000\n"
	for name, text := range map[string][]byte{"sn.csv": table.Bytes(), "templates.csv": templates.Bytes(), "sn.cov": cov.Bytes(), "run.toml": []byte(run)} {
		if err := os.WriteFile(filepath.Join(dir, name), text, 0o600); err != nil {
			b.Fatal(err)
		}
	}
	return dir
}

// BenchmarkRun is a whole fit as a process of its own, from its start to the summary
// on the terminal: a full covariance of 1701 rows as text read for the first time,
// and from the cache; a million supernovae with twenty templates. Beside the time it
// reports the processor time, the peak of the memory, and the effective samples per
// second of sampling.
func BenchmarkRun(b *testing.B) {
	path, err := build()
	if err != nil {
		b.Fatal(err)
	}
	full := survey(b, 1701, true)
	b.Run("cold", func(b *testing.B) { benchmarkRun(b, path, full, "--no-report", "--no-cache") })
	b.Run("warm", func(b *testing.B) { benchmarkRun(b, path, full, "--no-report") })
	b.Run("warm, report", func(b *testing.B) { benchmarkRun(b, path, full) })
	million := survey(b, 1_000_000, false)
	b.Run("million", func(b *testing.B) { benchmarkRun(b, path, million, "--no-report", "--no-cache") })
}

func benchmarkRun(b *testing.B, path, dir string, flags ...string) {
	kept := filepath.Join(dir, "cache")
	process := func() *exec.Cmd {
		out := filepath.Join(dir, "out")
		os.RemoveAll(out)
		cmd := exec.Command(path, append([]string{"fit", filepath.Join(dir, "run.toml"), "-o", out, "--quiet"}, flags...)...)
		cmd.Env = append(os.Environ(), "XDG_CACHE_HOME="+kept)
		if text, err := cmd.CombinedOutput(); err != nil {
			b.Fatalf("%v\n%s", err, text)
		}
		return cmd
	}
	process()
	var cpu time.Duration
	var memory int64
	for b.Loop() {
		state := process().ProcessState
		cpu += state.UserTime() + state.SystemTime()
		memory = max(memory, state.SysUsage().(*syscall.Rusage).Maxrss)
	}
	b.ReportMetric(cpu.Seconds()/float64(b.N), "cpu-s/op")
	b.ReportMetric(float64(memory)/1024, "MB-peak")
	var s result.Summary
	text, err := os.ReadFile(filepath.Join(dir, "out", "summary.json"))
	if err == nil {
		err = json.Unmarshal(text, &s)
	}
	if err != nil {
		b.Fatal(err)
	}
	b.ReportMetric(float64(s.Sampling.MinESS)/s.Sampling.Seconds, "samples/s")
}
