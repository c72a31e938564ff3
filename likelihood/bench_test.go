package likelihood

import (
	"fmt"
	"testing"

	"omen/data"
)

func curvedFamily(t testing.TB) Family {
	return Family{RequireBigBang: true, Free: []Parameter{param(t, "Om", 0, 1.5), param(t, "OL", -0.5, 1.8)}}
}

var sink float64

// benchmarkDensity evaluates a posterior at places about its peak.
func benchmarkDensity(b *testing.B, p *Posterior, at ...float64) {
	e := p.Evaluator()
	x := append([]float64(nil), at...)
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		i++
		x[0] = at[0] + 0.02*float64(i%8)
		sink += e.LogDensity(x)
	}
	if n := p.DirectEvaluations(); n > 0 {
		b.Errorf("%d direct evaluations", n)
	}
}

// BenchmarkPosterior is one evaluation of a posterior in Om and OL.
func BenchmarkPosterior(b *testing.B) {
	for _, n := range []int{1590, 100_000} {
		sn, templates := survey(1, n, 20)
		var noise Noise
		if n <= 2000 {
			noise = correlate(b, written(sn.Err, templates))
		} else {
			noise = must[Noise](b)(Systematics(sn.Err, templates, 20))
		}
		p := posterior(b, curvedFamily(b), must[*Supernovae](b)(NewSupernovae(sn, noise, Offset{}, Standing{})))
		b.Run(fmt.Sprintf("condensed/%d", n), func(b *testing.B) { benchmarkDensity(b, p, 0.25, 0.7) })
		b.Run(fmt.Sprintf("direct/%d", n), func(b *testing.B) { benchmarkDensity(b, p.Direct(), 0.25, 0.7) })
	}
}

// BenchmarkTables is the same for the kinds of data, alone and together.
func BenchmarkTables(b *testing.B) {
	sn := surveyTerm(b, 1, 1590, Offset{})
	z := []float64{0.295, 0.51, 0.51, 0.706, 0.706, 0.934, 0.934, 1.321, 1.321, 1.484, 1.484, 2.33, 2.33}
	table := &data.BAO{Z: z}
	for i := range z {
		table.Value, table.Err = append(table.Value, 20), append(table.Err, 0.3)
		table.Quantity = append(table.Quantity, []data.Quantity{data.DMOverRd, data.DHOverRd}[i%2])
	}
	bao := must[*BAO](b)(NewBAO(table, nil))
	f := curvedFamily(b)
	f.Free = append(f.Free, param(b, "hrd", 60, 140))
	b.Run("supernovae and BAO", func(b *testing.B) { benchmarkDensity(b, posterior(b, f, sn, bao), 0.25, 0.7, 100) })
	b.Run("BAO", func(b *testing.B) { benchmarkDensity(b, posterior(b, f, bao), 0.25, 0.7, 100) })
	b.Run("radiation", func(b *testing.B) {
		f := curvedFamily(b)
		f.FromTemperature = true
		benchmarkDensity(b, posterior(b, f, sn), 0.25, 0.7)
	})
	b.Run("w0-wa", func(b *testing.B) {
		f := Family{RequireBigBang: true, RequireMatterEra: true, DarkEnergy: W0Wa, Flat: true,
			Free: []Parameter{param(b, "Om", 0, 1), param(b, "w0", -3, 1), param(b, "wa", -3, 2)}}
		benchmarkDensity(b, posterior(b, f, sn), 0.25, -0.9, -0.2)
	})
}

// BenchmarkCondense goes through a table once: a full covariance that has been
// factorised, and twenty templates of a million supernovae.
func BenchmarkCondense(b *testing.B) {
	f := curvedFamily(b)
	b.Run("covariance/1590", func(b *testing.B) {
		table, templates := survey(1, 1590, 20)
		noise := correlate(b, written(table.Err, templates))
		for b.Loop() {
			posterior(b, f, must[*Supernovae](b)(NewSupernovae(table, noise, Offset{}, Standing{})))
		}
	})
	b.Run("templates/1000000", func(b *testing.B) {
		table, templates := survey(1, 1_000_000, 20)
		noise := must[Noise](b)(Systematics(table.Err, templates, 20))
		for b.Loop() {
			posterior(b, f, must[*Supernovae](b)(NewSupernovae(table, noise, Offset{}, Standing{})))
		}
	})
}
