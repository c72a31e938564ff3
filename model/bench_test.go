package model

import (
	"math"
	"testing"
)

var (
	benchLambda = Universe{Om: 0.3, OL: 0.6, H0: 70, W0: -1}
	benchClosed = Universe{Om: 0.4, OL: 0.9, H0: 70, W0: -1}
	benchW      = Universe{Om: 0.3, OL: 0.9, H0: 70, W0: -0.9}
	benchW0Wa   = Universe{Om: 0.3, OL: 0.9, H0: 70, W0: -0.8, Wa: -0.7}
	benchNear   = Universe{Om: 0.3, OL: 1.7134, H0: 70, W0: -1}
)

var benchCases = []struct {
	name string
	u    Universe
}{
	{"lambda", benchLambda},
	{"lambda-closed", benchClosed},
	{"lambda-radiation", Universe{Om: 0.4, OL: 0.9, Or: 8e-5, H0: 70, W0: -1}},
	{"w", benchW},
	{"w0-wa", benchW0Wa},
	{"loitering", benchNear},
	{"w0-wa-early", Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -0.7, Wa: 0.2}},
	{"phantom", Universe{Om: 0.3, OL: 0.68, H0: 70, W0: -1.05}},
	{"recollapse", Universe{Om: 1.3, OL: -0.2, H0: 70, W0: -1}},
}

// benchRedshifts are n redshifts as a supernova survey spreads them, denser at low z, from 0.001 to 2.26.
func benchRedshifts(n int) []float64 {
	z := make([]float64, n)
	for i := range z {
		f := (float64(i) + 0.5) / float64(n)
		z[i] = 0.001 + 2.26*math.Pow(f, 3)
	}
	return z
}

func BenchmarkPathFill(b *testing.B) {
	p, err := NewPath(benchRedshifts(1590))
	if err != nil {
		b.Fatal(err)
	}
	dm, dh := make([]float64, p.Len()), make([]float64, p.Len())
	for _, c := range benchCases {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				p.Fill(c.u, dm, dh)
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(p.Len()), "ns/redshift")
		})
	}
}

// BenchmarkPathFillNodes is the same for the few nodes of an interpolation in redshift.
func BenchmarkPathFillNodes(b *testing.B) {
	p, err := NewPath(benchRedshifts(24))
	if err != nil {
		b.Fatal(err)
	}
	dm := make([]float64, p.Len())
	for _, c := range benchCases {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				p.Fill(c.u, dm, nil)
			}
		})
	}
}

func benchmarkEach(b *testing.B, f func(Universe)) {
	for _, c := range benchCases {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				f(c.u)
			}
		})
	}
}

func BenchmarkE2(b *testing.B)         { benchmarkEach(b, func(u Universe) { u.E2(0.5) }) }
func BenchmarkHasBigBang(b *testing.B) { benchmarkEach(b, func(u Universe) { u.HasBigBang() }) }
func BenchmarkFate(b *testing.B)       { benchmarkEach(b, func(u Universe) { u.Fate() }) }
func BenchmarkAgeToday(b *testing.B)   { benchmarkEach(b, func(u Universe) { u.AgeToday() }) }
func BenchmarkDM(b *testing.B)         { benchmarkEach(b, func(u Universe) { u.DM(1) }) }
func BenchmarkLookback(b *testing.B)   { benchmarkEach(b, func(u Universe) { u.Lookback(0.7) }) }
func BenchmarkRip(b *testing.B)        { benchmarkEach(b, func(u Universe) { u.Rip() }) }
func BenchmarkCrunch(b *testing.B)     { benchmarkEach(b, func(u Universe) { u.Crunch() }) }

func BenchmarkAccelerationOnset(b *testing.B) {
	benchmarkEach(b, func(u Universe) { u.AccelerationOnset() })
}

func BenchmarkHistory(b *testing.B) {
	times := make([]float64, 200)
	for i := range times {
		times[i] = 0.2 * float64(i+1)
	}
	a := make([]float64, len(times))
	benchmarkEach(b, func(u Universe) { u.History(times, a) })
}
