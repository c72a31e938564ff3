package result

import (
	"math"

	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
)

// tables turns a belief into probabilities: of each fate, of each with w held if w
// changes, and of the statements about today. What is impossible in the family is left
// out.
func tables(b outlook.Belief, f likelihood.Family) (fates, held, today []Fate) {
	fates = table(outlook.Fates(), b, f)
	if f.DarkEnergy == likelihood.W0Wa {
		held = table(outlook.HeldFates(), b, f)
	}
	return fates, held, table(outlook.Today(), b, f)
}

func table(list []outlook.Statement, b outlook.Belief, f likelihood.Family) []Fate {
	var out []Fate
	for _, s := range list {
		share := b.Probability(s.Holds)
		if share.P == 0 && !outlook.Possible(f, s.Holds) {
			continue
		}
		if !outlook.Possible(f, func(l outlook.Label) bool { return !s.Holds(l) }) {
			if s.Name == flatToday {
				continue // it was assumed
			}
			share = outlook.Exactly(1)
		}
		out = append(out, fateOf(s.Name, share))
	}
	return out
}

// flatToday is said of no family that assumes it.
const flatToday = "flat (Ok = 0)"

func fateOf(name string, s outlook.Share) Fate {
	f := Fate{Name: name, Probability: Number(s.P), Error: Number(s.Err), Upper95: Number(math.NaN())}
	switch {
	case !math.IsNaN(s.Upper):
		f.Upper95, f.Error = Number(s.Upper), Number(math.NaN())
	case !math.IsNaN(s.Lower):
		f.Upper95, f.Error = Number(1-s.Lower), Number(math.NaN())
	}
	return f
}

// beside puts what the chain says beside what was integrated.
func beside(exact, chain []Fate) []Fate {
	for i := range exact {
		exact[i].Exact = true
		for k := range chain {
			if chain[k].Name == exact[i].Name {
				exact[i].Chain = &chain[k]
			}
		}
	}
	return exact
}
