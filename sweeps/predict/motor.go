package predict

import (
	"math"

	"nightbench/sweeps/internal/numeric"
)

// friction is the torque that a turning shaft asks for, N·m.
func (l *load) friction(speed float64) float64 {
	return l.coulomb + speed*(l.viscous+speed*l.quad)
}

// balance finds the back-EMF at which mean torque equals friction: K·Ī(E) falls
// with E and friction rises, so there is one root or none. None: the shaft
// stands, E = 0. A resistor has no back-EMF.
func (l *load) balance(c *cycle) (emf float64, w wave) {
	w = c.steady(0)
	if l.k == 0 || l.k*w.current() <= l.coulomb {
		return 0, w
	}
	top := c.sources[driven].v
	excess := func(e float64) float64 {
		w = c.steady(e)
		return l.k*w.current() - l.friction(e/l.k)
	}
	if excess(top) >= 0 {
		return top, w
	}
	emf, err := numeric.Brent(excess, 0, top, 1e-10*top)
	if err != nil { // bracketed above: only a load of no finite friction is left
		return 0, c.steady(0)
	}
	return emf, c.steady(emf)
}

// tau is the mechanical time constant J·R/K², s; 0 where no inertia is given.
func (l *load) tau(series float64) float64 {
	if l.k == 0 {
		return 0
	}
	return l.inertia * (l.r + series) / (l.k * l.k)
}

// starts tells whether a locked wave's peak torque overcomes static friction (it
// twitches) and its mean torque sliding friction (it keeps turning).
func (l *load) starts(locked *wave) (twitches, keeps bool) {
	return l.k*locked.peak > math.Max(l.static, l.coulomb), l.k*locked.current() > l.coulomb
}
