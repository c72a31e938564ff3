package runfile

import (
	"strings"
	"testing"
)

func TestIdentity(t *testing.T) {
	const text = good + "title = \"x\"\ncovariance = \"sn.cov\"\n[sampling]\nseed = 3\neffective-samples = 4000\n"
	base, err := Identity([]byte(text))
	if err != nil || len(base) != 64 {
		t.Fatal(base, err)
	}
	for _, c := range []struct {
		old, new string
		same     bool
	}{
		{"4000", "9000", true},
		{"effective-samples = 4000", "max-steps = 10\nmax-time = \"1h\"\nsync-interval = \"1s\"", true},
		{"seed = 3", "# a remark\nseed   =   3", true},
		{"sn.csv", "elsewhere/sn.csv", true},
		{"sn.cov", "elsewhere/sn.cov", true},
		{"OL = 0.7", "OL = 0.7\nH0 = 70", false},
		{"[0, 1]", "[0, 1.5]", false},
		{"seed = 3", "seed = 4", false},
		{"seed = 3", "seed = 3\nrecord-every = 2", false},
		{"supernovae", "bao", false},
	} {
		changed := strings.Replace(text, c.old, c.new, 1)
		if changed == text {
			t.Fatalf("no %q", c.old)
		}
		if got, err := Identity([]byte(changed)); err != nil || (got == base) != c.same {
			t.Errorf("%q for %q: same identity %v, want %v; %v", c.new, c.old, got == base, c.same, err)
		}
	}
	if _, err := Identity([]byte("[broken")); err == nil {
		t.Error("broken TOML has an identity")
	}
}
