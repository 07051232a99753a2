package circuit

import "math"

// An arc is one state variable over one step: the solution of x' = f(x) with f
// linearised at the start, f ≈ F + J (x − X), plus the third-order correction
// for what the linearisation missed:
//
//	x(t) = X + t φ1(tJ) F + Fix (t/H)³
//
// It is exact for a linear circuit whatever the step, and never blows up
// however stiff the circuit is.
type arc struct {
	X, F, J float64 // start value, its slope (1/s), the slope's derivative (1/s)
	Fix     float64 // correction reached at the step's end
	H       float64 // length of the step, s; 0 until it is known

	end, avg float64 // value at H, mean over the step; kept because asked often
}

// span fixes the step's length.
func (a *arc) span(h float64) {
	a.H = h
	z := h * a.J
	p := phi1(z)
	q := (p - 1) / z
	if math.Abs(z) < 0.02 {
		q = phi2(z)
	}
	a.end = a.X + h*p*a.F
	a.avg = a.X + h*q*a.F
}

// correct adds what the linearisation missed, reached at the step's end.
func (a *arc) correct(fix float64) {
	a.Fix = fix
	a.end += fix
	a.avg += fix / 4
}

// at gives the value t seconds into the step.
func (a *arc) at(t float64) float64 {
	if t == a.H {
		return a.end
	}
	x := a.X + t*phi1(t*a.J)*a.F
	if a.Fix != 0 {
		r := t / a.H
		x += a.Fix * r * r * r
	}
	return x
}

// mean gives the mean value between ta and tb seconds into the step.
func (a *arc) mean(ta, tb float64) float64 {
	switch {
	case tb <= ta:
		return a.at(ta)
	case ta == 0 && tb == a.H:
		return a.avg
	}
	return (a.integral(tb) - a.integral(ta)) / (tb - ta)
}

func (a *arc) integral(t float64) float64 {
	if t == 0 {
		return 0
	}
	s := a.X*t + t*t*phi2(t*a.J)*a.F
	if a.Fix != 0 {
		r := t / a.H
		s += a.Fix * t * r * r * r / 4
	}
	return s
}

// reach gives the time at which the linearised arc arrives at target, or
// +Inf when it never does.
func (a *arc) reach(target float64) float64 {
	d := target - a.X
	if d == 0 {
		return 0
	}
	if a.F == 0 || (d > 0) != (a.F > 0) {
		return math.Inf(1)
	}
	z := a.J * d / a.F
	switch {
	case z <= -1:
		return math.Inf(1)
	case math.Abs(z) < 1e-9:
		return d / a.F
	}
	return math.Log1p(z) / a.J
}

// The φ functions of exponential integration: φ0 = e^z, φk+1 = (φk − 1/k!)/z
// (Hochbruck and Ostermann, Exponential integrators, Acta Numerica 2010, eq. 2.11).

func phi1(z float64) float64 {
	if math.Abs(z) < 1e-5 {
		return 1 + z/2 + z*z/6
	}
	return math.Expm1(z) / z
}

func phi2(z float64) float64 {
	if math.Abs(z) < 0.02 {
		return 1./2 + z*(1./6+z*(1./24+z*(1./120+z/720)))
	}
	return (phi1(z) - 1) / z
}

func phi3(z float64) float64 {
	if math.Abs(z) < 0.05 {
		return 1./6 + z*(1./24+z*(1./120+z*(1./720+z*(1./5040+z/40320))))
	}
	return (phi2(z) - 0.5) / z
}
