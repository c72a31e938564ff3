package result

import (
	"omen/likelihood"
	"omen/sampler"
)

// DerivedDraws returns the derived quantities of a space along a view, by the
// names that they have in a [Summary].
func DerivedDraws(space *likelihood.Space, view sampler.View, threads int) ([]string, []sampler.Draws) {
	d := derive(space, view, threads)
	return d.names, d.draws
}
