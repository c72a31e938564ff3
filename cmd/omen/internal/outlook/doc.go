// Package outlook says what becomes of the universes of a posterior. A [Label] is
// what can be said of one universe without a number: its fate, its geometry, whether
// it accelerates. A [Belief] is a posterior that knows the probability of whatever
// labels say, be it a chain or an integral. [Events] are the moments of a universe's
// life, and [Trace] is its size through time.
package outlook
