package predict

import "math"

// engaged is a stage with its load: the stage's curves, straightened at the mean
// currents while driven and while freewheeling, and the winding's cycle.
type engaged struct {
	m       *Model
	o       *outcome
	p       *parts
	c       *conditions
	extra   float64 // A of the timing network on the output, while the load is driven
	idle    float64 // and while not
	y       cycle
	on, fly float64 // A, where the curves are straightened
}

// turn computes the cycle at a back-EMF and moves the straightening to its
// currents; moved tells by how much of themselves they were off.
func (e *engaged) turn(emf float64) (moved float64) {
	e.straighten()
	e.o.emf, e.o.wave = emf, e.y.steady(emf)
	return e.follow()
}

func (e *engaged) straighten() {
	e.m.connect(&e.o.driver, e.p, e.c, &e.o.output, e.on, e.fly, e.extra, e.idle)
	e.y.sources = e.o.sources
}

func (e *engaged) follow() (moved float64) {
	on := math.Max(0, e.o.wave.spells[driven].mean())
	fly := math.Max(0, e.o.wave.spells[free].mean())
	if on > 0 {
		moved = math.Abs(on-e.on) / on
	}
	if fly > 0 { // a diode's voltage changes with the logarithm only
		moved = math.Max(moved, 0.01*math.Abs(fly-e.fly)/fly)
	}
	e.on, e.fly = on, fly
	return moved
}

// nearEnough is how far the straightening currents may be off: what is left of
// a curve's error is of second order.
const nearEnough = 1e-5

// chase looks for the running point by the secant method, moving the straightening
// along. It gives up, false, where the way is not clear: near standstill, or after 15 turns.
func (e *engaged) chase() bool {
	l := &e.p.load
	if l.k == 0 {
		return false
	}
	e.straighten()
	top := e.y.sources[driven].v
	duty := e.y.on / (e.y.on + e.y.off)
	x, before, fBefore := top*(0.3+0.6*duty), 0.0, 0.0
	for k := range 15 {
		moved := e.turn(x)
		f := l.k*e.o.wave.current() - l.friction(x/l.k)
		slope := -l.k/(l.r+e.c.burden)*math.Max(0.2, duty) - (l.viscous+2*l.quad*x/l.k)/l.k
		if k > 0 && f != fBefore && x != before {
			slope = (f - fBefore) / (x - before)
		}
		step := -f / slope
		if math.Abs(step) <= 1e-9*top && moved <= nearEnough {
			return true
		}
		if !(slope < 0) {
			return false
		}
		before, fBefore = x, f
		x = math.Min(x+step, (x+top)/2)
		if !(x > 1e-3*top) {
			return false
		}
	}
	return false
}

// settle is the sure way: at fixed curves a bracketed root, then the curves
// straightened again, which converges as Newton's method does; at most 12 rounds.
func (e *engaged) settle() {
	for range 12 {
		e.straighten()
		e.o.emf, e.o.wave = e.p.load.balance(&e.y)
		if e.follow() <= nearEnough {
			return
		}
	}
}
