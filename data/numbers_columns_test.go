package data

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestReadColumns(t *testing.T) {
	table := "omegam;weight;name\n0.3;1;a\n0.4;0;b\n"
	want := []Column{{Name: "Om", What: "matter"}, {Name: "OL", What: "dark energy", Optional: true}, {Name: "weight", What: "the weight", NotNegative: true}}
	got, s, err := ReadColumns(strings.NewReader(table), "s.csv", Options{Columns: map[string]string{"Om": "omegam"}}, want...)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(map[string][]float64{"Om": {0.3, 0.4}, "weight": {1, 0}}, got); diff != "" || s.Read != 2 {
		t.Errorf("%d rows, %s", s.Read, diff)
	}
	for _, c := range []struct{ table, want string }{
		{"Om,weight\n0.3,-1\n", `s.csv:2: column "weight": found -1, expected a finite number, 0 or above`},
		{"Om,weight\nx,1\n", `s.csv:2: column "Om": found "x", expected a finite number`},
		{"matter,weight\n1,1\n", `column "Om": no such column`},
	} {
		if _, _, err := ReadColumns(strings.NewReader(c.table), "s.csv", Options{}, want...); err == nil || !strings.Contains(err.Error(), strings.TrimPrefix(c.want, `column "Om": `)) {
			t.Errorf("got %v, want %s", err, c.want)
		}
	}
}
