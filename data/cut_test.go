package data

import (
	"errors"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

const cutTable = `id survey z mag 3rdvar flag note
1 A 0.1 20 0.5 yes ""
2 A 0.2 21 ""  no  ""
3 B 0.3 22 1.5 yes ""
4 C 0.4 23 nan no  ""
5 B 0.5 24 2.5 yes ""
`

func TestCuts(t *testing.T) {
	tests := []struct {
		cut  string
		kept []int
		cuts []CutCount
	}{
		{"", []int{0, 1, 2, 3, 4}, nil},
		{"  ", []int{0, 1, 2, 3, 4}, nil},
		{"z > 0.15 && survey != 'C'", []int{1, 2, 4}, []CutCount{{"z > 0.15", 1}, {`survey != "C"`, 1}}},
		{"(z > 0.15 and z < 0.45) && flag == 'yes'", []int{2}, []CutCount{{"z > 0.15", 1}, {"z < 0.45", 1}, {`flag == "yes"`, 2}}},
		{"z > 0.15 && (survey == 'B' || id == 4)", []int{2, 3, 4}, []CutCount{{"z > 0.15", 1}, {`survey == "B" || id == 4`, 1}}},
		{"survey in ['A', 'C']", []int{0, 1, 3}, []CutCount{{`survey in ["A", "C"]`, 2}}},
		{"id in [1, 5]", []int{0, 4}, []CutCount{{"id in [1, 5]", 3}}},
		{"not (id in [1, 5])", []int{1, 2, 3}, []CutCount{{"not (id in [1, 5])", 2}}},
		{"id in 2..4", []int{1, 2, 3}, []CutCount{{"id in 2..4", 2}}},
		{"abs(mag - 22) <= 1", []int{1, 2, 3}, []CutCount{{"abs(mag - 22) <= 1", 2}}},
		// Nothing is known about an empty cell or NaN, so no comparison keeps it.
		{`$env["3rdvar"] > 1`, []int{2, 4}, []CutCount{{`$env["3rdvar"] > 1`, 3}}},
		{`$env["3rdvar"] <= 1`, []int{0}, []CutCount{{`$env["3rdvar"] <= 1`, 4}}},
		{"flag startsWith 'y'", []int{0, 2, 4}, []CutCount{{`flag startsWith "y"`, 2}}},
		{"note == ''", []int{0, 1, 2, 3, 4}, []CutCount{{`note == ""`, 0}}},
		{"true", []int{0, 1, 2, 3, 4}, []CutCount{{"true", 0}}},
	}
	for _, test := range tests {
		sn, err := ReadSupernovae(strings.NewReader(cutTable), "t.txt", Options{Cut: test.cut})
		if err != nil {
			t.Errorf("%s: %v", test.cut, err)
			continue
		}
		if diff := cmp.Diff(test.kept, sn.Kept); diff != "" {
			t.Errorf("%s: kept (-want +got):\n%s", test.cut, diff)
		}
		if diff := cmp.Diff(test.cuts, sn.Cuts); diff != "" {
			t.Errorf("%s: cuts (-want +got):\n%s", test.cut, diff)
		}
		for k, i := range test.kept {
			if sn.Lines[k] != i+2 || sn.Z[k] != float64(i+1)/10 {
				t.Errorf("%s: row %d has line %d, z %v", test.cut, k, sn.Lines[k], sn.Z[k])
			}
		}
	}
}

// What is wrong with a cut is told apart from what is wrong with a file.
func TestCutError(t *testing.T) {
	for _, c := range []struct {
		cut, in string
		want    bool
	}{
		{"z >", header + "a,0.1,20,0.1\n", true},
		{"Z > 1", header + "a,0.1,20,0.1\n", true},
		{"z > 1", header + "a,0.1,20,0.1\n", true},
		{"int(name) > 1", header + "a,0.1,20,0.1\n", true},
		{"z > 0", header + "a,0.1,x,0.1\n", false},
		{"z > 0", header, false},
	} {
		_, err := ReadSupernovae(strings.NewReader(c.in), "t.csv", Options{Cut: c.cut})
		var cut *CutError
		if err == nil || errors.As(err, &cut) != c.want {
			t.Errorf("%q: %T, %v; a CutError: expected %t", c.cut, err, err, c.want)
		}
	}
}

// A mapping is proposed in the words of the caller.
func TestMappingOfTheCaller(t *testing.T) {
	o := Options{Mapping: func(name, column string) string { return "--" + name + "=" + column }}
	_, err := ReadSupernovae(strings.NewReader("zHD,mag\n0.1,20\n"), "t.csv", o)
	wantMessage(t, err, `t.csv:1: column "z": found no such column, expected the redshift in the CMB frame; the nearest is "zHD": --z=zHD`)
}
