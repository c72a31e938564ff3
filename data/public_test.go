package data

import (
	"math"
	"os"
	"path/filepath"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// The tables below are read as their authors published them:
//
//   - Pantheon+: Scolnic et al. 2022 (ApJ 938:113), Brout et al. 2022 (ApJ 938:110)
//   - Pantheon 2018: Scolnic et al. 2018 (ApJ 859:101)
//   - DESI DR2: released BAO likelihood of arXiv:2503.14738

// public opens a file of the folder of public measurements.
func public(t *testing.T, name string) *os.File {
	t.Helper()
	dir := os.Getenv("OMEN_PUBLIC_DATA")
	if dir == "" {
		dir = filepath.Join("..", "..", "shared", "data")
	}
	f, err := os.Open(filepath.Join(dir, name))
	if err != nil {
		say := t.Skipf
		if os.Getenv("CI") != "" {
			say = t.Fatalf
		}
		say("no public data (%v): download the releases of Pantheon+, Pantheon 2018 and DESI DR2, put them in folders "+
			"pantheonplus, pantheon2018 and desi-dr2, and set OMEN_PUBLIC_DATA to the folder above", err)
	}
	t.Cleanup(func() { f.Close() })
	return f
}

var (
	pantheonPlus = map[string]string{"name": "CID", "survey": "IDSURVEY", "z": "zHD", "z_hel": "zHEL",
		"mag": "m_b_corr", "mag_err": "m_b_corr_err_DIAG"}
	pantheon2018 = map[string]string{"z": "zcmb", "z_hel": "zhel", "mag": "mb", "mag_err": "dmb"}
)

func TestPantheonPlusRows(t *testing.T) {
	tests := []struct {
		cut  string
		rows int
		cuts []CutCount
	}{
		{"", 1701, nil},
		{"zHD > 0.01", 1590, []CutCount{{"zHD > 0.01", 111}}},
		{"IS_CALIBRATOR == 1", 77, []CutCount{{"IS_CALIBRATOR == 1", 1624}}},
		{"zHD > 0.01 || IS_CALIBRATOR == 1", 1657, []CutCount{{"zHD > 0.01 || IS_CALIBRATOR == 1", 44}}},
		{"zHD > 0.01 && IS_CALIBRATOR == 0", 1580, []CutCount{{"zHD > 0.01", 111}, {"IS_CALIBRATOR == 0", 10}}},
		// The file's own USED_IN_SH0ES_HF marks the Hubble flow.
		{"USED_IN_SH0ES_HF == 1", 277, []CutCount{{"USED_IN_SH0ES_HF == 1", 1424}}},
	}
	for _, test := range tests {
		sn, err := ReadSupernovae(public(t, "pantheonplus/Pantheon+SH0ES.dat"), "sn.dat", Options{Columns: pantheonPlus, Cut: test.cut})
		if err != nil {
			t.Fatal(err)
		}
		if sn.Read != 1701 || len(sn.Z) != test.rows || len(sn.Kept) != test.rows {
			t.Errorf("%q: %d rows read, %d kept, want 1701, %d", test.cut, sn.Read, len(sn.Z), test.rows)
		}
		if diff := cmp.Diff(test.cuts, sn.Cuts); diff != "" {
			t.Errorf("%q: cuts (-want +got):\n%s", test.cut, diff)
		}
	}
}

func TestPantheonPlusCells(t *testing.T) {
	sn, err := ReadSupernovae(public(t, "pantheonplus/Pantheon+SH0ES.dat"), "sn.dat", Options{Columns: pantheonPlus})
	if err != nil {
		t.Fatal(err)
	}
	if sn.Absolute || sn.Name[0] != "2011fe" || sn.Survey[0] != "51" || sn.Z[0] != 0.00122 || sn.ZHel[0] != 0.00082 ||
		sn.Value[0] != 9.74571 || sn.Err[0] != 1.51621 || sn.Lines[0] != 2 {
		t.Errorf("first row: %v %v %v %v %v %v in line %d", sn.Name[0], sn.Survey[0], sn.Z[0], sn.ZHel[0], sn.Value[0], sn.Err[0], sn.Lines[0])
	}
	distinct := make(map[string]bool)
	for _, n := range sn.Name {
		distinct[n] = true
	}
	if len(distinct) != 1543 {
		t.Errorf("%d distinct names, want 1543", len(distinct))
	}
	rows, names := 0, 0
	for _, r := range sn.Repeated() {
		rows += len(r.Lines)
		names++
	}
	if got := len(sn.Z) - rows + names; got != 1543 {
		t.Errorf("%d distinct names by Repeated, want 1543", got)
	}
}

func TestPantheon2018(t *testing.T) {
	for name, rows := range map[string]int{"lcparam_DS17f.txt": 40, "lcparam_full_long_zhel.txt": 1048} {
		sn, err := ReadSupernovae(public(t, "pantheon2018/"+name), name, Options{Columns: pantheon2018})
		if err != nil {
			t.Fatal(err)
		}
		if len(sn.Z) != rows || len(sn.Err) != rows || sn.Lines[0] != 2 {
			t.Errorf("%s: %d rows, first in line %d, want %d, line 2", name, len(sn.Z), sn.Lines[0], rows)
		}
	}
}

func TestPantheon2018Covariance(t *testing.T) {
	sn, err := ReadSupernovae(public(t, "pantheon2018/lcparam_DS17f.txt"), "sn.txt", Options{Columns: pantheon2018, Cut: "zcmb > 0.1"})
	if err != nil {
		t.Fatal(err)
	}
	m, err := ReadMatrix(public(t, "pantheon2018/sys_DS17f.txt"), "sys.txt")
	if err != nil {
		t.Fatal(err)
	}
	c, err := Covariance("sys.txt", m, Added, sn.Selection, sn.Err)
	if err != nil {
		t.Fatal(err)
	}
	first := sn.Kept[0]
	if want := m.At(first, first) + sn.Err[0]*sn.Err[0]; c.At(0, 0) != want || c.At(0, 1) != m.At(first, first+1) {
		t.Errorf("corner %v %v, want %v %v", c.At(0, 0), c.At(0, 1), want, m.At(first, first+1))
	}
}

func TestDESI(t *testing.T) {
	b, err := ReadBAO(public(t, "desi-dr2/desi-dr2-bao.csv"), "bao.csv", Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(b.Z) != 13 || b.Quantity[0] != DVOverRd || b.Quantity[11] != DHOverRd || b.Value[12] != 38.98897396 {
		t.Errorf("%d rows, %v", len(b.Z), b)
	}
	m, err := ReadMatrix(public(t, "desi-dr2/desi-dr2-bao.cov"), "bao.cov")
	if err != nil {
		t.Fatal(err)
	}
	c, err := Covariance("bao.cov", m, Total, b.Selection, b.Err)
	if err != nil {
		t.Fatal(err)
	}
	for i, sigma := range b.Err {
		// The table prints the roots of the diagonal to eight decimals.
		if d := math.Sqrt(c.At(i, i)) - sigma; math.Abs(d) > 1e-8 {
			t.Errorf("row %d: error %v, diagonal² %v", i, sigma, math.Sqrt(c.At(i, i)))
		}
	}
}
