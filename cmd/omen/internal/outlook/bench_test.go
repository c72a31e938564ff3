package outlook

import (
	"math/rand/v2"
	"testing"

	"omen/model"
)

var benchFamilies = []struct {
	name string
	best model.Universe
}{
	{"lambda", model.Universe{Om: 0.3, OL: 0.66, H0: 70, W0: -1}},
	{"lambda-radiation", model.Universe{Om: 0.3, OL: 0.66, Or: 8.5e-5, H0: 70, W0: -1}},
	{"w", model.Universe{Om: 0.3, OL: 0.66, H0: 70, W0: -1.01}},
	{"w0-wa", model.Universe{Om: 0.31, OL: 0.69, H0: 67, W0: -0.8, Wa: -0.7}},
}

// benchSample scatters 400 universes about one as a posterior does.
func benchSample(best model.Universe) []model.Universe {
	r := rand.New(rand.NewPCG(5, 6))
	sample := make([]model.Universe, 400)
	for i := range sample {
		u := best
		u.Om += 0.01 * r.NormFloat64()
		u.OL += 0.03 * r.NormFloat64()
		u.H0 += 0.7 * r.NormFloat64()
		if u.W0 != -1 {
			u.W0 += 0.06 * r.NormFloat64()
		}
		if u.Wa != 0 {
			u.Wa += 0.25 * r.NormFloat64()
		}
		sample[i] = u
	}
	return sample
}

func BenchmarkTraces(b *testing.B) {
	for _, f := range benchFamilies {
		sample := benchSample(f.best)
		b.Run(f.name, func(b *testing.B) {
			for b.Loop() {
				Traces(f.best, sample, true, 0)
			}
		})
	}
}

// BenchmarkEvents is the time that one draw of a chain takes: all its moments.
func BenchmarkEvents(b *testing.B) {
	for _, f := range benchFamilies {
		sample, events := benchSample(f.best), Events(f.best.Wa != 0)
		b.Run(f.name, func(b *testing.B) {
			i := 0
			for b.Loop() {
				for _, e := range events {
					e.At(sample[i%len(sample)], true)
				}
				i++
			}
		})
	}
}

func BenchmarkLabelOf(b *testing.B) {
	for _, f := range benchFamilies {
		b.Run(f.name, func(b *testing.B) {
			for b.Loop() {
				LabelOf(f.best)
			}
		})
	}
}
