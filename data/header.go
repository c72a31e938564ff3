package data

import "io"

// Header reads the column names of a table and nothing else.
func Header(r io.Reader, file string) ([]string, error) {
	t, err := open(r, file)
	if err != nil {
		return nil, err
	}
	return t.names, nil
}
