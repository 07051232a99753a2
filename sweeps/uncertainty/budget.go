package uncertainty

import (
	"fmt"
	"math"
)

// Budget is an estimate and the causes of its uncertainty.
type Budget struct {
	X          float64
	Components []Component
}

// New returns a budget of the estimate and its components.
func New(x float64, components ...Component) Budget { return Budget{X: x, Components: components} }

// Add returns the budget with more components; the receiver is left alone.
func (b Budget) Add(components ...Component) Budget {
	all := make([]Component, 0, len(b.Components)+len(components))
	return Budget{X: b.X, Components: append(append(all, b.Components...), components...)}
}

// cause is what the components of one key add up to.
type cause struct {
	key   string
	share float64
	dof   float64
}

// causes adds components of the same key linearly, with their signs, since they are
// fully correlated. Their degrees of freedom are those of the least known one.
func (b Budget) causes() []cause {
	out := make([]cause, 0, len(b.Components))
	at := map[string]int{}
	for _, c := range b.Components {
		i, seen := at[c.Key]
		if c.Key == "" || !seen {
			at[c.Key] = len(out)
			out = append(out, cause{c.Key, c.Share(), c.DOF})
			continue
		}
		out[i].share += c.Share()
		out[i].dof = min(out[i].dof, c.DOF)
	}
	return out
}

// U returns the combined standard uncertainty: the root of the sum of squares of
// the independent causes (GUM 5.1.2), those that share a key added first (5.2.2).
func (b Budget) U() float64 {
	var u float64
	for _, c := range b.causes() {
		u = math.Hypot(u, c.share)
	}
	return u
}

// DOF returns the effective degrees of freedom by the Welch–Satterthwaite formula
// (GUM eq. G.2b) over the independent causes; +Inf when every cause has infinitely many.
func (b Budget) DOF() float64 {
	u := b.U()
	if u == 0 {
		return math.Inf(1)
	}
	var sum float64
	for _, c := range b.causes() {
		r := c.share / u
		sum += r * r * r * r / c.dof
	}
	return 1 / sum
}

// Value returns estimate, combined standard uncertainty and effective degrees of freedom.
func (b Budget) Value() Value { return Value{X: b.X, U: b.U(), DOF: b.DOF()} }

// Check reports the first component that cannot be combined, or a result that is not finite.
func (b Budget) Check() error {
	for _, c := range b.Components {
		if err := (Value{X: c.Sensitivity, U: c.U, DOF: c.DOF}).Check(); err != nil {
			return fmt.Errorf("budget component %q: %w", c.Source, err)
		}
	}
	return b.Value().Check()
}

// Covariance returns the covariance of two estimates: the causes they share, by
// key, with full correlation (GUM F.1.2.3). Causes without a key share nothing.
func Covariance(a, b Budget) float64 {
	shares := map[string]float64{}
	for _, c := range a.causes() {
		if c.key != "" {
			shares[c.key] = c.share
		}
	}
	var cov float64
	for _, c := range b.causes() {
		cov += shares[c.key] * c.share
	}
	return cov
}

// Correlation returns the correlation coefficient of two estimates; 0 if either is exact.
func Correlation(a, b Budget) float64 {
	ua, ub := a.U(), b.U()
	if ua == 0 || ub == 0 {
		return 0
	}
	return Covariance(a, b) / ua / ub
}

// Linear returns Σ factorᵢ·termᵢ with the terms' components kept, so that causes
// shared between terms cancel or add. There must be one factor a term.
func Linear(factors []float64, terms ...Budget) Budget {
	var out Budget
	for i, t := range terms {
		out.X += factors[i] * t.X
		for _, c := range t.Components {
			out.Components = append(out.Components, c.Times(factors[i]))
		}
	}
	return out
}

// Difference returns a − b; what both share cancels.
func Difference(a, b Budget) Budget { return Linear([]float64{1, -1}, a, b) }

// Disagreement returns |a − b| in units of the standard uncertainty of the
// difference: above about 2 the two roads disagree. It is 0 for equal exact
// values and +Inf for different ones.
func Disagreement(a, b Budget) float64 {
	d := Difference(a, b)
	if d.X == 0 {
		return 0
	}
	return math.Abs(d.X) / d.U()
}

// Mean returns the weighted mean of two roads to the same quantity with the least
// uncertainty, their covariance allowed for: w = (u_b² − u_ab)/(u_a² + u_b² − 2u_ab),
// held between 0 and 1 so that the mean never leaves the span of the two.
func Mean(a, b Budget) Budget {
	ab := Covariance(a, b)
	va, vb := a.U()*a.U(), b.U()*b.U()
	w := 0.5
	if v := va + vb - 2*ab; v > 0 {
		w = min(1, max(0, (vb-ab)/v))
	}
	return Linear([]float64{w, 1 - w}, a, b)
}
