package runfile

import "testing"

// What is computed beside a chain, and the odds, are none of the chain's business: a run
// goes on whatever becomes of them. The seed is.
func TestIdentityLeavesOutEngineAndOdds(t *testing.T) {
	identity := func(sets ...string) string {
		run, err := Parse("my.toml", []byte(good), sets)
		if err != nil {
			t.Fatal(err)
		}
		text, err := run.Resolved(".")
		if err != nil {
			t.Fatal(err)
		}
		id, err := Identity(text)
		if err != nil {
			t.Fatal(err)
		}
		return id
	}
	plain := identity()
	for _, set := range []string{"sampling.engine=chain", "fates.nested=false", "fates.odds.critical=3", "fates.ahead=2"} {
		if identity(set) != plain {
			t.Errorf("%s makes it another run", set)
		}
	}
	if identity("sampling.seed=9") == plain {
		t.Error("another seed is the same run")
	}
}
