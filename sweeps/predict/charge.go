package predict

import (
	"math"

	"nightbench/sweeps/internal/numeric"
)

// law is one phase of the timing network: a source behind a resistance feeds the
// common node; from there one way conducts to the capacitor and the other leaks
// along. sign is +1 while charging, −1 while discharging. The law is explicit in
// x: the junction voltage of the conducting diode, or, without a diode, the current through that way.
type law struct {
	sign, source, r float64
	output          *output // output-fed: the source is the timer's output, loaded with carried amperes besides
	carried         float64
	on, other       branch
	bias, leak      float64 // pin currents into the capacitor, less v·leak
	c               float64
}

// at gives, at x, the capacitor's voltage, its slope dv/dx, and the current into the capacitor.
func (l *law) at(x float64) (v, slope, i float64) {
	var id, did, w, dw float64
	if l.on.nvt > 0 {
		e := math.Exp(x / l.on.nvt)
		id, did = l.on.is*(e-1), l.on.is*e/l.on.nvt
		if l.on.shunt > 0 {
			id += x / l.on.shunt
			did += 1 / l.on.shunt
		}
		w, dw = x+l.on.r*id, 1+l.on.r*did
	} else {
		id, did = x, 1
		w, dw = l.on.r*x, l.on.r
	}
	leak, g := l.other.against(w)
	total, dtotal := id+leak, did+g*dw
	source, r := l.source, l.r
	if l.output != nil {
		var own float64
		source, own = l.output.level(l.sign > 0, total+l.carried)
		v = source - l.sign*(r*total+w)
		slope = -l.sign * ((r+own)*dtotal + dw)
	} else {
		v = source - l.sign*(r*total+w)
		slope = -l.sign * (r*dtotal + dw)
	}
	return v, slope, l.sign*total + l.bias - l.leak*v
}

// bisect finds the x between two at which the capacitor stands at v. It is for where
// Newton's method has no sure start: a kinked output table, and a wave that only
// the pins' currents carry past the source, so that the conducting diode is reversed.
func (l *law) bisect(v, lo, hi float64) float64 {
	for range 100 {
		mid := (lo + hi) / 2
		if at, _, _ := l.at(mid); l.sign*(at-v) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return (lo + hi) / 2
}

// span is the voltage there is to drive current at a capacitor voltage v.
func (l *law) span(v float64) float64 {
	source := l.source
	if l.output != nil {
		source, _ = l.output.level(l.sign > 0, l.carried)
	}
	return l.sign * (source - v)
}

// maxNewton bounds the search for an end point. From the side chosen it converges
// monotonically, and quadratically once near: five steps are usual.
const maxNewton = 60

// find is the x at which the capacitor stands at v. It starts beyond the root on
// the steep side: the current if the diode dropped nothing.
func (l *law) find(v float64) float64 {
	span := l.span(v)
	all := l.r + l.on.r
	x := span
	switch {
	case l.on.nvt == 0:
		x = span / all
	case span <= 0:
		return l.bisect(v, span, 0)
	case span > 0 && all > 0:
		x = min(span, l.on.nvt*math.Log1p(span/(all*l.on.is)))
	}
	beyond := x
	for range maxNewton {
		at, slope, _ := l.at(x)
		step := (v - at) / slope
		x += step
		if math.Abs(step) <= 1e-9*(math.Abs(x)+l.on.nvt) {
			return x
		}
	}
	return l.bisect(v, 0, beyond)
}

// end is an end point of a phase.
type end struct{ x, i float64 }

func (l *law) end(v float64) end {
	x := l.find(v)
	_, _, i := l.at(x)
	return end{x, i}
}

// runs tells whether the current at the phase's last point has the right sign. It
// falls monotonically over a phase, so that point speaks for the whole.
func (l *law) runs(last end) bool { return l.sign*last.i > 0 }

// steep is the ratio of currents above which an interval is halved before it is summed.
const steep = 6

// time is C·∫ dv/i_C from a to b, by Gauss–Legendre quadrature in x over intervals
// within which the current changes moderately. Both ends must run.
func (l *law) time(rule *numeric.Rule, a, b end) float64 {
	return l.c * l.sum(rule, a, b, 48)
}

func (l *law) sum(rule *numeric.Rule, a, b end, depth int) float64 {
	ratio := a.i / b.i
	if depth > 0 && (ratio > steep || ratio < 1/steep || l.bends(a.x, b.x)) {
		m := end{x: (a.x + b.x) / 2}
		_, _, m.i = l.at(m.x)
		return l.sum(rule, a, m, depth-1) + l.sum(rule, m, b, depth-1)
	}
	mid, half := (a.x+b.x)/2, (b.x-a.x)/2
	var s float64
	for k, x := range rule.X {
		_, slope, i := l.at(mid + half*x)
		s += rule.W[k] * slope / i
	}
	return s * half
}

// bends tells whether an interval is too wide for the leak's bend: a reversed
// junction behind a resistance passes from w/r to its saturation current within
// some n·Vt about w = is·r. The further from the bend, the wider an interval may be.
func (l *law) bends(a, b float64) bool {
	o := &l.other
	if o.is*o.rj < 0.1*o.nvt {
		return false
	}
	at := o.is * o.rj
	from, to := (l.across(a)*o.see-at)/o.nvt, (l.across(b)*o.see-at)/o.nvt
	from, to = math.Min(from, to), math.Max(from, to)
	if from > farReverse {
		return false
	}
	return to-from > 4+math.Max(0, math.Max(from, -to))
}

// across is the voltage across the two ways at x.
func (l *law) across(x float64) float64 {
	if l.on.nvt == 0 {
		return l.on.r * x
	}
	id := l.on.is * math.Expm1(x/l.on.nvt)
	if l.on.shunt > 0 {
		id += x / l.on.shunt
	}
	return x + l.on.r*id
}

// coast carries the wave past the level v, where the phase ends, for the time td and
// gives the voltage it reaches: four-stage Runge–Kutta in x, where dx/dt = i_C/(C·dv/dx).
func (l *law) coast(from end, v, td float64) float64 {
	if td == 0 {
		return v
	}
	_, slope, i := l.at(from.x)
	k := i / (l.c * slope)
	scale := math.Abs(v * l.c / i) // s in which the level would change by itself
	steps := 1 + int(min(8*td/scale, 200))
	h := td / float64(steps)
	rate := func(x float64) float64 {
		_, slope, i := l.at(x)
		return i / (l.c * slope)
	}
	x := from.x
	for range steps {
		k2 := rate(x + h/2*k)
		k3 := rate(x + h/2*k2)
		k4 := rate(x + h*k3)
		x += h / 6 * (k + 2*k2 + 2*k3 + k4)
		if steps > 1 {
			k = rate(x)
		}
	}
	v, _, _ = l.at(x)
	return v
}
