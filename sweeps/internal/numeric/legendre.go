package numeric

import "gonum.org/v1/gonum/integrate/quad"

// Rule is a quadrature rule on [-1, 1], reusable for any interval without allocating.
type Rule struct{ X, W []float64 }

// GaussLegendre returns the n-point Gauss–Legendre rule, exact for polynomials
// up to degree 2n−1. n must be positive. Nodes and weights are gonum's.
func GaussLegendre(n int) Rule {
	r := Rule{X: make([]float64, n), W: make([]float64, n)}
	quad.Legendre{}.FixedLocations(r.X, r.W, -1, 1)
	return r
}

// Integrate returns the integral of f from a to b; negative when b < a and f > 0.
func (r Rule) Integrate(f func(float64) float64, a, b float64) float64 {
	mid, half := (a+b)/2, (b-a)/2
	var sum float64
	for i, x := range r.X {
		sum += r.W[i] * f(mid+half*x)
	}
	return sum * half
}
