package model

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"testing"
)

// TestAstropy compares with a table made by an independent program: ../testdata/universes says which and how.
func TestAstropy(t *testing.T) {
	f, err := os.Open("../testdata/universes/universes.csv")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) < 301 {
		t.Fatalf("%d universes, want at least 300", len(rows)-1)
	}
	worst := map[string]float64{}
	for i, row := range rows[1:] {
		var v [12]float64
		for j := range v {
			if v[j], err = strconv.ParseFloat(row[j], 64); err != nil {
				t.Fatal(err)
			}
		}
		u := Universe{Om: v[0], OL: v[1], Or: v[2], H0: v[3], W0: v[4], Wa: v[5]}
		z := v[6]
		p, err := NewPath([]float64{z})
		if err != nil {
			t.Fatal(err)
		}
		var dm [1]float64
		p.Fill(u, dm[:], nil)
		for _, c := range []struct {
			name      string
			got, want float64
		}{
			{"DC", u.DC(z), v[7]}, {"DM", u.DM(z), v[8]}, {"DL", u.DL(z), v[9]},
			{"lookback", u.Lookback(z), v[10]}, {"age", u.Age(z), v[11]},
			{"Path DM", dm[0] * C / u.H0, v[8]},
		} {
			diff := math.Abs(c.got/c.want - 1)
			worst[c.name] = math.Max(worst[c.name], diff)
			if !(diff <= 1e-7) {
				t.Errorf("row %d %+v z %v: %s = %v, astropy %v (relative %.1e)", i+1, u, z, c.name, c.got, c.want, diff)
			}
		}
	}
	t.Logf("worst relative differences: %v", worst)
}
