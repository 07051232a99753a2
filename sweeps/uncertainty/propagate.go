package uncertainty

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
)

// Propagate carries budgets through f to first order (GUM 5.1, 5.2). The
// sensitivities are central differences over ±u of each input (GUM 5.1.3 note 2); the
// components keep their keys, so causes shared between inputs are correlated in
// the result. Where f bends within ±u, or its derivative vanishes, first order
// understates the uncertainty: use trials instead (JCGM 101:2008).
func Propagate(f func(x []float64) float64, inputs ...Budget) Budget {
	x := make([]float64, len(inputs))
	for i, in := range inputs {
		x[i] = in.X
	}
	out := Budget{X: f(x)}
	for i, in := range inputs {
		c := sensitivity(f, x, i, in.U())
		for _, k := range in.Components {
			out.Components = append(out.Components, k.Times(c))
		}
	}
	return out
}

// sensitivity returns ∂f/∂xᵢ by a central difference over ±u, or over a
// millionth of the input where u is too small to show in f. x is restored.
func sensitivity(f func([]float64) float64, x []float64, i int, u float64) float64 {
	at := x[i]
	h := max(u, 1e-6*math.Abs(at), 1e-150)
	x[i] = at + h
	up := f(x)
	x[i] = at - h
	down := f(x)
	x[i] = at
	return (up - down) / (2 * h)
}

// Joint holds estimates read together and the covariance of those estimates.
type Joint struct {
	X   []float64
	Cov *mat.SymDense
}

// Simultaneous evaluates quantities read together n times, one slice of readings
// a quantity (GUM 5.2.3, H.2): their means, and the covariances of the means,
// Σ(a−ā)(b−b̄)/(n(n−1)).
func Simultaneous(readings ...[]float64) (Joint, error) {
	if len(readings) == 0 || len(readings[0]) < 2 {
		return Joint{}, fmt.Errorf("evaluate simultaneous readings: %w", ErrTooFew)
	}
	n, m := len(readings[0]), len(readings)
	j := Joint{X: make([]float64, m), Cov: mat.NewSymDense(m, nil)}
	for i, a := range readings {
		if len(a) != n {
			return Joint{}, fmt.Errorf("evaluate simultaneous readings: quantity %d has %d readings, quantity 1 has %d", i+1, len(a), n)
		}
		j.X[i] = stat.Mean(a, nil)
		for k, b := range readings[:i+1] {
			j.Cov.SetSym(i, k, stat.Covariance(a, b, nil)/float64(n))
		}
	}
	return j, nil
}

// U returns the standard uncertainty of quantity i.
func (j Joint) U(i int) float64 { return math.Sqrt(j.Cov.At(i, i)) }

// R returns the correlation coefficient of quantities i and k; 0 if either is exact.
func (j Joint) R(i, k int) float64 {
	if j.U(i) == 0 || j.U(k) == 0 {
		return 0
	}
	return j.Cov.At(i, k) / j.U(i) / j.U(k)
}

// Through carries the estimates and their covariance through several functions at
// once: V' = J V Jᵀ (GUM F.1.2.3, JCGM 102:2011 6.2).
func (j Joint) Through(functions ...func(x []float64) float64) Joint {
	x := append([]float64(nil), j.X...)
	jac := mat.NewDense(len(functions), len(x), nil)
	out := Joint{X: make([]float64, len(functions)), Cov: mat.NewSymDense(len(functions), nil)}
	for r, f := range functions {
		out.X[r] = f(x)
		for c := range x {
			jac.Set(r, c, sensitivity(f, x, c, j.U(c)))
		}
	}
	var v mat.Dense
	v.Product(jac, j.Cov, jac.T())
	for r := range functions {
		for c := range r + 1 {
			out.Cov.SetSym(r, c, (v.At(r, c)+v.At(c, r))/2)
		}
	}
	return out
}
