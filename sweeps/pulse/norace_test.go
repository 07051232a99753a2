//go:build !race

package pulse

// share of the generated cases that run.
const share = 1.0
