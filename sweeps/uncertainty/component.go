package uncertainty

import "math"

// Type says how a component was evaluated (GUM 3.3.5).
type Type string

const (
	A Type = "A" // by statistics of repeated readings
	B Type = "B" // by any other means: accuracy figures, resolution, judgement
)

// Component is one line of a budget: one cause of uncertainty.
type Component struct {
	Source string // the cause in words: "meter gain"
	// Key names the one physical cause. Components with the same key, in one
	// budget or in several, are fully correlated (r = 1, the sign coming from
	// the sensitivities). An empty key is a cause of its own, correlated with nothing.
	Key         string
	Type        Type
	U           float64 // standard uncertainty, in the unit of the cause
	Divisor     float64 // what the stated half-width was divided by to give U; 1 when U was stated
	Sensitivity float64 // ∂(quantity)/∂(cause), signed
	DOF         float64 // degrees of freedom of U; +Inf when it is taken as known
}

// Share returns the signed contribution of the component to its quantity, cᵢuᵢ, in the quantity's unit.
func (c Component) Share() float64 { return c.Sensitivity * c.U }

// Keyed returns the component with its cause named; see Key.
func (c Component) Keyed(key string) Component {
	c.Key = key
	return c
}

// Times returns the component with its sensitivity multiplied by factor.
func (c Component) Times(factor float64) Component {
	c.Sensitivity *= factor
	return c
}

// Scatter is the type A component of repeated readings, as Repeats evaluates them.
func Scatter(source string, v Value) Component {
	return Component{Source: source, Type: A, U: v.U, Divisor: 1, Sensitivity: 1, DOF: v.DOF}
}

// Known is a type B component whose standard uncertainty is stated as such.
func Known(source string, u float64) Component { return typeB(source, u, 1) }

// Normal is a type B component stated as an expanded uncertainty with coverage
// factor k, as calibration certificates do (GUM 4.3.3).
func Normal(source string, expanded, k float64) Component { return typeB(source, expanded, k) }

// Rectangular is a type B component known only to lie within ±halfWidth, such as
// a maker's accuracy limit: a/√3 (GUM 4.3.7).
func Rectangular(source string, halfWidth float64) Component {
	return typeB(source, halfWidth, math.Sqrt(3))
}

// Triangular is a type B component within ±halfWidth and likelier near the middle, such
// as the difference of two equal rectangular ones: a/√6 (GUM 4.3.9).
func Triangular(source string, halfWidth float64) Component {
	return typeB(source, halfWidth, math.Sqrt(6))
}

// Arcsine is a type B component that swings between ±amplitude like a sine, seen
// at a random phase: a/√2 (GUM H.1.3.4).
func Arcsine(source string, amplitude float64) Component {
	return typeB(source, amplitude, math.Sqrt2)
}

// Resolution is the component of an indication that moves in steps: ±step/2,
// rectangular, so step/√12 (GUM F.2.2.1).
func Resolution(source string, step float64) Component {
	return typeB(source, step, math.Sqrt(12))
}

func typeB(source string, stated, divisor float64) Component {
	return Component{Source: source, Type: B, U: math.Abs(stated) / divisor, Divisor: divisor, Sensitivity: 1, DOF: math.Inf(1)}
}

// JudgedDOF returns the degrees of freedom of a type B uncertainty that is
// itself thought uncertain by the relative amount given: ½ (Δu/u)⁻² (GUM G.3).
func JudgedDOF(relative float64) float64 { return 0.5 / (relative * relative) }
