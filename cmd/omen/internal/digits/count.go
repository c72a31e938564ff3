package digits

import (
	"strconv"
	"strings"
)

// Count writes a number of things whose plural is regular: "1 row", "2 rows",
// "2 degrees of freedom".
func Count(n int, thing string) string {
	if n != 1 {
		head, rest, of := strings.Cut(thing, " of ")
		if thing = head + "s"; of {
			thing += " of " + rest
		}
	}
	return strconv.Itoa(n) + " " + thing
}
