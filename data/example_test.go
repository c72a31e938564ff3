package data_test

import (
	"fmt"
	"strings"

	"omen/data"
)

// A release table is read as it was published: the mapping says which of its columns are meant, the cut is
// written in its own names, and the covariance is cut with the rows.
func Example() {
	table := `# light curves of an invented survey
id   zHD   zHEL  m_b    dm    host
N1   0.008 0.009 13.70  0.20  dwarf
N2   0.031 0.030 16.25  0.12  spiral
N3   0.052 0.052 17.44  0.11  spiral
`
	covariance := `3
0.04   0      0
0      0.0144 0.001
0      0.001  0.0121
`
	sn, err := data.ReadSupernovae(strings.NewReader(table), "table.txt", data.Options{
		Columns: map[string]string{"name": "id", "z": "zHD", "z_hel": "zHEL", "mag": "m_b", "mag_err": "dm"},
		Cut:     "zHD > 0.01 && host != 'ring'",
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	m, err := data.ReadMatrix(strings.NewReader(covariance), "table.cov")
	if err != nil {
		fmt.Println(err)
		return
	}
	c, err := data.Covariance("table.cov", m, data.Total, sn.Selection, sn.Err)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(sn.Name, sn.Z, sn.Value)
	for _, cut := range sn.Cuts {
		fmt.Println(cut.Expression, "removed", cut.Removed)
	}
	fmt.Println(c.At(0, 0), c.At(0, 1), c.At(1, 1))
	// Output:
	// [N2 N3] [0.031 0.052] [16.25 17.44]
	// zHD > 0.01 removed 1
	// host != "ring" removed 0
	// 0.0144 0.001 0.0121
}
