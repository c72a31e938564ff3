package data

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
)

// farthest is the distance from which on a name does not resemble another.
const farthest = 0.5

// Nearest is the candidate that a misspelt name most likely meant: the first of several, "" of none.
func Nearest(name string, candidates []string) string {
	if near := byDistance(name, candidates); len(near) > 0 {
		return near[0]
	}
	return ""
}

// meant proposes the candidate that resembles a name, or some of them if none does.
func meant(name string, candidates []string) string {
	near := byDistance(name, slices.DeleteFunc(slices.Clone(candidates), func(c string) bool { return c == "" }))
	switch {
	case len(near) == 0:
		return "it has none with a name"
	case distance(name, near[0]) <= farthest:
		return fmt.Sprintf("did you mean %q?", near[0])
	}
	const few = 12
	if len(near) > few {
		return fmt.Sprintf("its columns are %s and %d more", strings.Join(near[:few], ", "), len(near)-few)
	}
	return "its columns are " + strings.Join(near, ", ")
}

// byDistance sorts the candidates by their likeness to name.
func byDistance(name string, candidates []string) []string {
	near := slices.Clone(candidates)
	slices.SortStableFunc(near, func(a, b string) int { return cmp.Compare(distance(name, a), distance(name, b)) })
	return near
}

// distance is the share of letters to be edited, from 0 to 1: half as much if one name starts with the other, as
// abbreviations do, and hardly anything for a different case.
func distance(a, b string) float64 {
	s, t := strings.ToLower(a), strings.ToLower(b)
	longer := float64(max(1, len(s), len(t)))
	d := float64(edits(s, t)) / longer
	if s != "" && t != "" && (strings.HasPrefix(s, t) || strings.HasPrefix(t, s)) {
		d /= 2
	}
	return d + 0.01*float64(edits(a, b))/longer
}

// edits counts the insertions, deletions and substitutions between a and b (Levenshtein 1966).
func edits(a, b string) int {
	s, t := []rune(a), []rune(b)
	row := make([]int, len(t)+1)
	for j := range row {
		row[j] = j
	}
	for i, c := range s {
		diagonal := row[0]
		row[0] = i + 1
		for j, d := range t {
			cost := 1
			if c == d {
				cost = 0
			}
			diagonal, row[j+1] = row[j+1], min(row[j]+1, row[j+1]+1, diagonal+cost)
		}
	}
	return row[len(t)]
}
