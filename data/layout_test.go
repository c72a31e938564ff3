package data

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// The same two rows in every way a table may be written.
func TestLayouts(t *testing.T) {
	tests := map[string]struct {
		in    string
		lines []int
	}{
		"comma":                {"name,z,mu,mu_err\nSN a,0.1,38.3,0.1\nb,0.2,40,0.12\n", []int{2, 3}},
		"comma and blanks":     {"name, z, mu, mu_err\nSN a, 0.1 , 38.3,0.1\nb,\t0.2,40,0.12 \n", []int{2, 3}},
		"semicolon":            {"name;z;mu;mu_err\nSN a;0.1;38.3;0.1\nb;0.2;40;0.12", []int{2, 3}},
		"semicolon and comma":  {"name;z;mu;mu_err;note, long\nSN a;0.1;38.3;0.1;x, y\nb;0.2;40;0.12;\n", []int{2, 3}},
		"tab":                  {"name\tz\tmu\tmu_err\nSN a\t0.1\t38.3\t0.1\nb\t0.2\t40\t0.12\n", []int{2, 3}},
		"tab, empty cell":      {"name\tnote\tz\tmu\tmu_err\nSN a\t\t0.1\t38.3\t0.1\nb\t\t0.2\t40\t0.12\n", []int{2, 3}},
		"blanks":               {"  name  z   mu mu_err  \n\"SN a\" 0.1 38.3\t0.1\n\n  b  0.2 40  0.12\n", []int{2, 4}},
		"quoted":               {"\"name\",\"z\",mu,mu_err\n\"SN a\",\"0.1\",38.3,0.1\n\"b\",0.2,40,0.12\n", []int{2, 3}},
		"CRLF":                 {"name,z,mu,mu_err\r\nSN a,0.1,38.3,0.1\r\nb,0.2,40,0.12\r\n", []int{2, 3}},
		"CRLF, blanks":         {"name z mu mu_err\r\n\"SN a\" 0.1 38.3 0.1\r\nb 0.2 40 0.12\r\n", []int{2, 3}},
		"byte-order mark":      {"\ufeffname,z,mu,mu_err\nSN a,0.1,38.3,0.1\nb,0.2,40,0.12\n", []int{2, 3}},
		"comments":             {"# by hand\n\nname,z,mu,mu_err\n# first\nSN a,0.1,38.3,0.1\n  # then\n \t \nb,0.2,40,0.12\n#\n", []int{5, 8}},
		"header in comment":    {"# made today\n#name z mu mu_err \n\"SN a\" 0.1 38.3 0.1\nb 0.2 40 0.12\n", []int{3, 4}},
		"comma, header in #":   {"# name, z, mu, mu_err\nSN a,0.1,38.3,0.1\nb,0.2,40,0.12\n", []int{2, 3}},
		"Fortran":              {"name z mu mu_err\n\"SN a\" 1.0D-01 0.383d+02 1.D-1\nb 2.D-01 4.0E+01 +.12\n", []int{2, 3}},
		"index without a name": {",name,z,mu,mu_err,\n0,SN a,0.1,38.3,0.1,\n1,b,0.2,40,0.12,\n", []int{2, 3}},
		"gzip":                 {gzipped("name,z,mu,mu_err\nSN a,0.1,38.3,0.1\nb,0.2,40,0.12\n"), []int{2, 3}},
	}
	for name, test := range tests {
		t.Run(name, func(t *testing.T) {
			sn, err := ReadSupernovae(strings.NewReader(test.in), "t.csv", Options{})
			if err != nil {
				t.Fatal(err)
			}
			want := &Supernovae{Name: []string{"SN a", "b"}, Z: []float64{0.1, 0.2}, Value: []float64{38.3, 40}, Err: []float64{0.1, 0.12},
				Absolute: true, Selection: Selection{File: "t.csv", Read: 2, Kept: []int{0, 1}, Lines: test.lines}}
			if diff := cmp.Diff(want, sn, unexported); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
}

var unexported = cmp.FilterPath(func(p cmp.Path) bool { return p.Last().String() == ".names" }, cmp.Ignore())

func TestQuotesBetweenBlanks(t *testing.T) {
	row, ok := splitBlanks(nil, "  \"a \"\"b\"\" c\" 1 \"\"\t\"\"\"\"\n")
	if diff := cmp.Diff([]string{`a "b" c`, "1", "", `"`}, row); diff != "" || !ok {
		t.Errorf("%v %s", ok, diff)
	}
}

func TestHeaderWithSurplusName(t *testing.T) {
	sn, err := ReadSupernovae(strings.NewReader("#z mag set\n0.1 20\n0.2 21\n"), "t.txt", Options{})
	if err != nil {
		t.Fatal(err)
	}
	want := `t.txt:1: column "set": found 3 names, expected 2 as the rows have cells; the last is ignored; check that the others stand over their columns`
	if len(sn.Warnings) != 1 || sn.Warnings[0].Error() != want {
		t.Errorf("warnings %v, want %s", sn.Warnings, want)
	}
}

func TestOptionalColumns(t *testing.T) {
	sn, err := ReadSupernovae(strings.NewReader("z,mag\n0.1,20\n"), "t.csv", Options{})
	if err != nil {
		t.Fatal(err)
	}
	if sn.Name != nil || sn.Survey != nil || sn.ZHel != nil || sn.Err != nil || sn.Absolute {
		t.Errorf("columns out of nothing: %+v", sn)
	}
	both := "z,mu,mag\n0.1,39,20\n"
	sn, err = ReadSupernovae(strings.NewReader(both), "t.csv", Options{Columns: map[string]string{"mu": "mu"}})
	if err != nil || !sn.Absolute || sn.Value[0] != 39 {
		t.Errorf("a mapping of mu does not choose it: %+v, %v", sn, err)
	}
	sn, err = ReadSupernovae(strings.NewReader(both), "t.csv", Options{Columns: map[string]string{"mag": "mag"}})
	if err != nil || sn.Absolute || sn.Value[0] != 20 {
		t.Errorf("a mapping of mag does not choose it: %+v, %v", sn, err)
	}
}

// Cells that no quantity and no cut uses may hold anything, and so may those of rows that a cut removes.
func TestUnusedCellsAreNotRead(t *testing.T) {
	in := "z,mag,note,use\n0.1,20,NaN,1\nbad,-,,0\n0.3,22,text,1\n"
	sn, err := ReadSupernovae(strings.NewReader(in), "t.csv", Options{Cut: "use == 1"})
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]float64{0.1, 0.3}, sn.Z); diff != "" {
		t.Error(diff)
	}
}

func TestBAO(t *testing.T) {
	in := "z,quantity,value\n0.5,DM_over_rd,13.5\n0.5,DH_over_rd,21\n0.3,DV_over_rd,8\n1.5,DM_over_DH,2.4\n"
	b, err := ReadBAO(strings.NewReader(in), "b.csv", Options{Cut: "z > 0.4"})
	if err != nil {
		t.Fatal(err)
	}
	want := &BAO{Z: []float64{0.5, 0.5, 1.5}, Quantity: []Quantity{DMOverRd, DHOverRd, DMOverDH}, Value: []float64{13.5, 21, 2.4},
		Selection: Selection{File: "b.csv", Read: 4, Kept: []int{0, 1, 3}, Lines: []int{2, 3, 5}, Cuts: []CutCount{{"z > 0.4", 1}}}}
	if diff := cmp.Diff(want, b, unexported); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

func TestAges(t *testing.T) {
	in := "name z age error bound\nA 1.55 3.5 0.5 lower\nB 0 12.6 0.6 measured\nC 0.5 6 1 \"\"\n"
	a, err := ReadAges(strings.NewReader(in), "a.txt", Options{})
	if err != nil {
		t.Fatal(err)
	}
	want := &Ages{Name: []string{"A", "B", "C"}, Z: []float64{1.55, 0, 0.5}, Age: []float64{3.5, 12.6, 6}, Err: []float64{0.5, 0.6, 1},
		Bound:     []Bound{LowerBound, Measured, Measured},
		Selection: Selection{File: "a.txt", Read: 3, Kept: []int{0, 1, 2}, Lines: []int{2, 3, 4}}}
	if diff := cmp.Diff(want, a, unexported); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if got := a.Label(0); got != "A (a.txt:2)" {
		t.Errorf("label %q", got)
	}
}

func TestRates(t *testing.T) {
	h, err := ReadRates(strings.NewReader("z;H;error\n0.07;69;19.6\n0.9;117;23\n"), "h.csv", Options{})
	if err != nil {
		t.Fatal(err)
	}
	want := &Rates{Z: []float64{0.07, 0.9}, H: []float64{69, 117}, Err: []float64{19.6, 23},
		Selection: Selection{File: "h.csv", Read: 2, Kept: []int{0, 1}, Lines: []int{2, 3}}}
	if diff := cmp.Diff(want, h, unexported); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
}

func TestRepeated(t *testing.T) {
	sn, err := ReadSupernovae(strings.NewReader(header+"a,.1,20,1\nb,.1,20,1\na,.1,20,1\n,.1,20,1\n,.1,20,1\nc,.1,20,1\nb,.1,20,1\nb,.1,20,1\n"), "t.csv", Options{})
	if err != nil {
		t.Fatal(err)
	}
	want := []Repeat{{"a", []int{2, 4}}, {"b", []int{3, 8, 9}}}
	if diff := cmp.Diff(want, sn.Repeated()); diff != "" {
		t.Error(diff)
	}
}

func TestRecognise(t *testing.T) {
	tests := []struct {
		header string
		want   map[string]string
	}{
		{"CID IDSURVEY zHD zCMB zHEL m_b_corr m_b_corr_err_DIAG mB", map[string]string{"name": "CID", "survey": "IDSURVEY", "z": "zHD",
			"z_hel": "zHEL", "mag": "m_b_corr", "mag_err": "m_b_corr_err_DIAG"}},
		{"name zcmb zhel dz mb dmb", map[string]string{"name": "name", "z": "zcmb", "z_hel": "zhel", "mag": "mb", "mag_err": "dmb"}},
		{"zhd mu MUERR", map[string]string{"z": "zhd", "mu": "mu", "mu_err": "MUERR"}},
		{"zHD MU MUERR mag", map[string]string{"z": "zHD", "mag": "mag"}},
		{"Z z mag", map[string]string{"z": "z", "mag": "mag"}},
		{"z zHD H error", map[string]string{"z": "z", "H": "H", "error": "error"}},
		{"x y", map[string]string{}},
	}
	for _, test := range tests {
		if diff := cmp.Diff(test.want, Recognise(strings.Fields(test.header))); diff != "" {
			t.Errorf("%s (-want +got):\n%s", test.header, diff)
		}
	}
}

func TestDistance(t *testing.T) {
	for _, test := range []struct {
		name, candidates, want string
	}{
		{"zHD", "zCMB zhd zHEL", "zhd"},
		{"IS_CALIBRATR", "CID IS_CALIBRATOR", "IS_CALIBRATOR"},
		{"mag_err", "mag mag_error", "mag_error"},
		{"z", "mag zeff", "zeff"},
		{"q", "", ""},
	} {
		if got := Nearest(test.name, strings.Fields(test.candidates)); got != test.want {
			t.Errorf("nearest to %s of %s: %s, want %s", test.name, test.candidates, got, test.want)
		}
	}
	if d := edits("kitten", "sitting"); d != 3 {
		t.Errorf("edits %d, want 3", d)
	}
}
