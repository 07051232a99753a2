//go:build race

package pulse

// share of the generated cases that run: the race detector makes them ten times slower.
const share = 0.08
