package data

// Nearest is the candidate that a misspelt name most likely meant, "" of none.
func Nearest(name string, candidates []string) string { return nearest(name, candidates) }
