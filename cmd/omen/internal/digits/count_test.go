package digits

import "testing"

func TestCount(t *testing.T) {
	for _, c := range []struct {
		n           int
		thing, want string
	}{
		{0, "row", "0 rows"}, {1, "row", "1 row"}, {2, "row", "2 rows"}, {-1, "row", "-1 rows"},
		{1, "degree of freedom", "1 degree of freedom"}, {12, "degree of freedom", "12 degrees of freedom"},
	} {
		if got := Count(c.n, c.thing); got != c.want {
			t.Errorf("Count(%d, %q) = %q, expected %q", c.n, c.thing, got, c.want)
		}
	}
}
