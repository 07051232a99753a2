// Package uncertainty carries values with their standard uncertainty and
// degrees of freedom, and the budgets they come from, by the Guide to the
// expression of uncertainty in measurement (JCGM 100:2008, "GUM").
//
// A Budget lists the causes of an uncertainty. Two budgets that name the same
// cause (Component.Key) move together: the gain error of one meter cancels in
// the difference of two of its readings and is not averaged away by repeating.
package uncertainty

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// Value is an estimate X with its standard uncertainty U, both in the same
// unit, and the degrees of freedom of U: +Inf when U is taken as known.
type Value struct{ X, U, DOF float64 }

// Exact is a value without uncertainty.
func Exact(x float64) Value { return Value{X: x, DOF: math.Inf(1)} }

// Check reports a value that must not be used as a result: not finite, or with
// an uncertainty or degrees of freedom that cannot be.
func (v Value) Check() error {
	switch {
	case math.IsNaN(v.X) || math.IsInf(v.X, 0):
		return fmt.Errorf("value %g is not finite", v.X)
	case math.IsNaN(v.U) || math.IsInf(v.U, 0) || v.U < 0:
		return fmt.Errorf("standard uncertainty %g of value %g: must be finite and not negative", v.U, v.X)
	case math.IsNaN(v.DOF) || v.DOF <= 0:
		return fmt.Errorf("degrees of freedom %g of value %g: must be positive, or infinite", v.DOF, v.X)
	}
	return nil
}

// Expanded returns the half-width U of the interval X ± U that covers with
// probability p, such as 0.95 (GUM 6.2.1).
func (v Value) Expanded(p float64) float64 { return CoverageFactor(p, v.DOF) * v.U }

// Interval returns the ends of the interval that covers with probability p.
func (v Value) Interval(p float64) (low, high float64) {
	h := v.Expanded(p)
	return v.X - h, v.X + h
}

// CoverageFactor returns k = t_p(ν) for a two-sided interval of probability p
// (GUM G.3.4). Degrees of freedom that are not whole are truncated to the next
// lower whole number, as GUM G.4.1 note 1 allows; below one, one is used.
// p must lie between 0 and 1.
func CoverageFactor(p, dof float64) float64 {
	tail := 1 - (1-p)/2
	if math.IsInf(dof, 1) || dof > 1e6 {
		return distuv.UnitNormal.Quantile(tail)
	}
	// A sum that should give a whole number may fall short of it by rounding.
	nu := max(1, math.Floor(dof*(1+1e-12)))
	return distuv.StudentsT{Mu: 0, Sigma: 1, Nu: nu}.Quantile(tail)
}

// ErrTooFew means that scatter cannot be told from fewer than two readings.
var ErrTooFew = errors.New("at least two readings are needed to tell their scatter")

// Repeats evaluates n independent readings of the same thing (type A, GUM 4.2):
// their mean, s/√n, and n−1 degrees of freedom.
func Repeats(readings []float64) (Value, error) {
	n := len(readings)
	if n < 2 {
		return Value{}, fmt.Errorf("evaluate %d repeats: %w", n, ErrTooFew)
	}
	mean, s := stat.MeanStdDev(readings, nil)
	return Value{X: mean, U: s / math.Sqrt(float64(n)), DOF: float64(n - 1)}, nil
}
