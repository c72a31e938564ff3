package data

import (
	"bytes"
	"compress/gzip"
	"errors"
	"io"
	"strings"
	"testing"
	"testing/iotest"
)

const header = "name,z,mag,mag_err\n"

func supernovae(r io.Reader, file string, o Options) (any, error) {
	return ReadSupernovae(r, file, o)
}

func bao(r io.Reader, file string, o Options) (any, error)   { return ReadBAO(r, file, o) }
func ages(r io.Reader, file string, o Options) (any, error)  { return ReadAges(r, file, o) }
func rates(r io.Reader, file string, o Options) (any, error) { return ReadRates(r, file, o) }

// One case for every way a table can be wrong, with the whole message.
func TestTableErrors(t *testing.T) {
	tests := []struct {
		read func(io.Reader, string, Options) (any, error)
		in   string
		o    Options
		want string
	}{
		{supernovae, "", Options{},
			`t.csv: found an empty file, expected a header row and rows of measurements; check that it was written completely`},
		{supernovae, "\n  \n# nothing\n", Options{},
			`t.csv: found an empty file, expected a header row and rows of measurements; check that it was written completely`},
		{supernovae, header, Options{},
			`t.csv:1: found a header and no rows, expected at least one row; check that the table was written completely`},
		{supernovae, "a,0.1,20,0.1\n", Options{},
			`t.csv:1: found numbers in the first row, expected the names of the columns; write a header row above it`},
		{supernovae, "# three words only\na,0.1,20,0.1,0.7\n", Options{},
			`t.csv:2: found numbers in the first row, expected the names of the columns; write a header row above it`},
		{supernovae, "#z mag\n\n0.1 20\n", Options{},
			`t.csv:3: found numbers in the first row, expected the names of the columns; write a header row above it`},
		{supernovae, "name,zHD,mag\na,0.1,20\n", Options{},
			`t.csv:1: column "z": found no such column, expected the redshift in the CMB frame; the nearest is "zHD": columns = { z = "zHD" }`},
		{supernovae, "name,Zcos,mag\na,0.1,20\n", Options{},
			`t.csv:1: column "z": found no such column, expected the redshift in the CMB frame; the nearest is "Zcos": columns = { z = "Zcos" }`},
		{supernovae, "z,brightness\n0.1,20\n", Options{},
			`t.csv:1: column "mag": found no such column, expected the distance modulus (mu) or the standardised magnitude (mag); name one, such as brightness: columns = { mag = "…" }`},
		{supernovae, "zHD,mag\n0.1,20\n", Options{Columns: map[string]string{"z": "zHd"}},
			`t.csv:1: column "zHd": found no such column, expected the one mapped to z; the nearest is "zHD": columns = { z = "zHD" }`},
		{supernovae, "z,mag\n0.1,20\n", Options{Columns: map[string]string{"z_err": "z"}},
			`t.csv: found a mapping of "z_err", expected one of z, mag, mag_err, z_hel, name, survey; did you mean "z"?`},
		{supernovae, "z,mu,mag\n0.1,39,20\n", Options{},
			`t.csv:1: found both mu and mag, expected one of them; choose with columns = { mu = "mu" } or { mag = "mag" }`},
		{supernovae, "z,mag,z\n0.1,20,0.1\n", Options{},
			`t.csv:1: column "z": found the name twice, in columns 1 and 3, expected every name once; rename one of them`},
		{supernovae, header + "a,0.1,20,0.1\nb,0.1,20\n", Options{},
			`t.csv:3: found 3 cells, expected 4 as in the header in line 1; add or remove a separator, or quote a cell that contains one`},
		{supernovae, "name z mag mag_err\n a 0.1 20 0.1\nb 0.1 20 0.1 7\n", Options{},
			`t.csv:3: found 5 cells, expected 4 as in the header in line 1; add or remove a separator, or quote a cell that contains one`},
		{supernovae, header + "a,0.1,20,0.1\n\n# note\nb,fast,20,0.1\n", Options{},
			`t.csv:5: column "z": found "fast", expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,20,0.1\n\"b\nb\",0.2,20,0.1\nc,-0.3,20,0.1\n", Options{},
			`t.csv:5: column "z": found -0.3, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0,20,0.1\n", Options{},
			`t.csv:2: column "z": found 0, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,1e10,20,0.1\n", Options{},
			`t.csv:2: column "z": found 1e10, expected a redshift below 2000; is this a velocity, or another column?`},
		{supernovae, "z,z_hel,mag,mag_err\n0.1,30000,20,0.1\n", Options{},
			`t.csv:2: column "z_hel": found 30000, expected a redshift below 2000; is this a velocity, or another column?`},
		{bao, "z,quantity,value,error\n2000,DM_over_rd,13,0.2\n", Options{},
			`t.csv:2: column "z": found 2000, expected a redshift below 2000; is this a velocity, or another column?`},
		{ages, "z,age,error\n1e10,3.5,0.2\n", Options{},
			`t.csv:2: column "z": found 1e10, expected a redshift below 2000; is this a velocity, or another column?`},
		{rates, "z,H,error\n1e10,69,4\n", Options{},
			`t.csv:2: column "z": found 1e10, expected a redshift below 2000; is this a velocity, or another column?`},
		{supernovae, header + "a,0.1,NaN,0.1\n", Options{},
			`t.csv:2: column "mag": found NaN, expected a finite number; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,-Inf,0.1\n", Options{},
			`t.csv:2: column "mag": found -Inf, expected a finite number; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,1e999,0.1\n", Options{},
			`t.csv:2: column "mag": found 1e999, expected a finite number; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,20,1e300\n", Options{},
			`t.csv:2: column "mag_err": found 1e300, expected a number that can be squared, 1e-100 to 1e100 in size; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,1e-300,20,0.1\n", Options{},
			`t.csv:2: column "z": found 1e-300, expected a number that can be squared, 1e-100 to 1e100 in size; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,-1e308,0.1\n", Options{},
			`t.csv:2: column "mag": found -1e308, expected a number that can be squared, 1e-100 to 1e100 in size; correct the cell, or leave the row out with a cut`},
		{supernovae, "# old\rname,z,mag\ra,0.1,20\r", Options{},
			`t.csv:1: found lines that end in a carriage return alone, expected a line feed after every row; save it again with the line ends of Unix or Windows`},
		{supernovae, header + "a,0.1,20,-0.1\n", Options{},
			`t.csv:2: column "mag_err": found -0.1, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,20,0\n", Options{},
			`t.csv:2: column "mag_err": found 0, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,20,\n", Options{},
			`t.csv:2: column "mag_err": found an empty cell, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{supernovae, "name;z;dm\na;0,1;20\n", Options{Columns: map[string]string{"mu": "dm"}},
			`t.csv:2: column "z": found "0,1", expected a finite number above 0; write the decimal mark as a point`},
		{supernovae, "z,z_hel,mu\n0.1,-1,39\n", Options{},
			`t.csv:2: column "z_hel": found -1, expected a finite number above -1; correct the cell, or leave the row out with a cut`},
		{supernovae, header + "a,0.1,20,0.1\nb\",0.1,20,0.1\n", Options{},
			`t.csv:3: found a stray quotation mark, expected a pair around a whole cell; remove it, or double it inside a quoted cell`},
		{supernovae, "# note\n" + header + "a,\"0.1,20,0.1\n", Options{},
			`t.csv:3: found a stray quotation mark, expected a pair around a whole cell; remove it, or double it inside a quoted cell`},
		{supernovae, "name z mag\na 0.1 20\n\"b 0.1 20\n", Options{},
			`t.csv:3: found a stray quotation mark, expected a pair around a whole cell; remove it, or double it inside a quoted cell`},
		{supernovae, header + strings.Repeat("x", longestLine) + "\n", Options{},
			`t.csv:2: found a line longer than a megabyte, expected a table of text; check that this is the file you meant`},
		{supernovae, "z mag\n0.1 20\n0.2 20\n" + strings.Repeat("x", longestLine) + "\n", Options{},
			`t.csv:4: found a line longer than a megabyte, expected a table of text; check that this is the file you meant`},
		{supernovae, "\xff\xfez\x00,\x00", Options{},
			`t.csv: found text in UTF-16, expected UTF-8; save it again as UTF-8`},
		{supernovae, "\x93NUMPY\x01\x00", Options{},
			`t.csv: found binary data, expected text; check that this is the file you meant`},
		{supernovae, gzipped(header + "a,0.1,20,0.1\n")[:30], Options{},
			`t.csv: found a damaged or cut-off file, expected a whole one; copy or download it again`},
		{supernovae, "\x1f\x8bnot gzip at all", Options{},
			`t.csv: found a damaged or cut-off file, expected a whole one; copy or download it again`},

		{supernovae, header + "a,0.1,20,0.1\nb,0.2,20,0.1\n", Options{Cut: "z > 0.15 && mag > 99"},
			`t.csv: found no row left of 2 by the cut "z > 0.15 && mag > 99", expected at least one; loosen "z > 0.15", which removed 1`},
		{supernovae, header + "a,0.1,20,0.1\n", Options{Cut: "Z > 0.15"},
			`t.csv:1: column "Z": found no such column, expected a column of this file in the cut "Z > 0.15"; did you mean "z"?`},
		{supernovae, header + "a,0.1,20,0.1\n", Options{Cut: "redshift > 0.15"},
			`t.csv:1: column "redshift": found no such column, expected a column of this file in the cut "redshift > 0.15"; its columns are name, z, mag, mag_err`},
		{supernovae, header + "a,0.1,20,0.1\n", Options{Cut: `$env["mag-err"] > 0`},
			`t.csv:1: column "mag-err": found no such column, expected a column of this file in the cut "$env[\"mag-err\"] > 0"; did you mean "mag_err"?`},
		{supernovae, header + "a,0.1,20,0.1\n", Options{Cut: "z >"},
			`t.csv: found the cut "z >" (unexpected token EOF), expected a condition on its columns; write it like zHD > 0.01 && IS_CALIBRATOR == 0`},
		{supernovae, header + "a,0.1,20,0.1\n", Options{Cut: "z + 1"},
			`t.csv: found the cut "z + 1" (expected bool, but got float64), expected a condition on its columns; write it like zHD > 0.01 && IS_CALIBRATOR == 0`},
		{supernovae, header + "a,0.1,20,0.1\n", Options{Cut: "name > 3"},
			`t.csv: found the cut "name > 3" (invalid operation: > (mismatched types string and int)), expected a condition on its columns; write it like zHD > 0.01 && IS_CALIBRATOR == 0`},
		{supernovae, header + "a,0.1,20,0.1\nb,0.2,20,0.1\n", Options{Cut: `int(name + "x") > 3`},
			`t.csv:2: found the cut "int(name + \"x\") > 3" (invalid operation: int(ax)), expected a condition on its columns; write it like zHD > 0.01 && IS_CALIBRATOR == 0`},

		{bao, "z,quantity,value,error\n0.5,DM/rd,13,0.2\n", Options{},
			`t.csv:2: column "quantity": found "DM/rd", expected one of DM_over_rd, DH_over_rd, DV_over_rd, DM_over_DH; did you mean DM_over_rd?`},
		{bao, "z,quantity,value,error\n0.5,DM_over_rd,-13,0.2\n", Options{},
			`t.csv:2: column "value": found -13, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{bao, "z,kind,ratio,sig\n0.5,DM_over_rd,13,0.2\n0.5,DM_over_rd,13,0\n",
			Options{Columns: map[string]string{"quantity": "kind", "value": "ratio", "error": "sig"}},
			`t.csv:3: column "sig": found 0, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{ages, "z,age\n1.5,3.5\n", Options{},
			`t.csv:1: column "error": found no such column, expected the error of the age; add it`},
		{ages, "z,age,error,bound\n1.5,3.5,0.2,upper\n", Options{},
			`t.csv:2: column "bound": found "upper", expected "measured" or "lower"; write one of the two`},
		{ages, "z,age,error\n-0.1,3.5,0.2\n", Options{},
			`t.csv:2: column "z": found -0.1, expected a finite number, 0 or above; correct the cell, or leave the row out with a cut`},
		{ages, "z,age,error\n0.1,0,0.2\n", Options{},
			`t.csv:2: column "age": found 0, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{rates, "z,H,error\n0.1,+Inf,4\n", Options{},
			`t.csv:2: column "H": found +Inf, expected a finite number above 0; correct the cell, or leave the row out with a cut`},
		{rates, "z\tHz\terror\n0.1\t69\t4\n", Options{},
			`t.csv:1: column "H": found no such column, expected the expansion rate in km/s/Mpc; the nearest is "Hz": columns = { H = "Hz" }`},
	}
	for _, test := range tests {
		_, err := test.read(strings.NewReader(test.in), "t.csv", test.o)
		wantMessage(t, err, test.want)
	}
}

func wantMessage(t *testing.T, err error, want string) {
	t.Helper()
	var own *Error
	switch {
	case err == nil:
		t.Errorf("no error, want %s", want)
	case err.Error() != want:
		t.Errorf("\n got %s\nwant %s", err, want)
	case !errors.As(err, &own):
		t.Errorf("%T, want *Error: %v", err, err)
	}
}

func gzipped(s string) string {
	var b bytes.Buffer
	w := gzip.NewWriter(&b)
	io.WriteString(w, s)
	w.Close()
	return b.String()
}

// A reader that fails is not the file's mistake: its error comes back with the file's name.
func TestReaderFails(t *testing.T) {
	broken := errors.New("disk on fire")
	inputs := []string{"", "z,", header, header + "a,0.1,20,0.1\n", "z mag\n0.1 20\n0.2 20\n"}
	for _, in := range inputs {
		r := io.MultiReader(strings.NewReader(in), iotest.ErrReader(broken))
		_, err := ReadSupernovae(r, "t.csv", Options{})
		if !errors.Is(err, broken) || err.Error() != "t.csv: disk on fire" {
			t.Errorf("%q: %v", in, err)
		}
	}
	for _, in := range []string{"", "2", "2\n1 0\n0 "} {
		r := io.MultiReader(strings.NewReader(in), iotest.ErrReader(broken))
		if _, err := ReadMatrix(r, "c.cov"); !errors.Is(err, broken) {
			t.Errorf("matrix %q: %v", in, err)
		}
	}
}
