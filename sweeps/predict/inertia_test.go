package predict

import (
	"math"
	"testing"
)

// turning integrates current and speed of a chopped motor with its inertia in small
// steps, until the speed repeats from period to period; means over the last period.
func turning(l *load, c *cycle, emf float64) (current, voltage, speed float64) {
	const steps = 1000
	period := c.on + c.off
	h := period / steps
	w, i := emf/l.k, 0.0
	tau := l.tau(0)
	periods := 20 + int(60*tau/period) // small steps of friction come to rest slowly
	for range periods {
		current, voltage, speed = 0, 0, 0
		for n := range steps {
			on := float64(n)*h < c.on
			v := c.sources[free].v
			switch {
			case on:
				v = c.sources[driven].v
			case i <= 0:
				i, v = 0, l.k*w
			}
			di := (v - l.k*w - c.r*i) / c.l
			next := math.Max(0, i+h*di)
			mid := (i + next) / 2
			w = math.Max(0, w+h*(l.k*mid-l.friction(w))/l.inertia)
			i = next
			current, voltage, speed = current+mid/steps, voltage+v/steps, speed+w/steps
		}
	}
	return current, voltage, speed
}

// The speed is taken as constant over a period. Below T/τm = 0.1 that costs less than
// one percent, and most near standstill; above, the truth stays within what the band is widened by.
func TestConstantSpeedAndItsWidening(t *testing.T) {
	worst := map[bool]float64{}
	for _, duty := range []float64{0.25, 0.5, 0.8} {
		for _, ratio := range []float64{0.02, 0.09, 0.3, 1} {
			for _, coulomb := range []float64{4e-4, 2e-3} { // light, and at low duty nearly standing
				l := load{r: 6, l: 2e-3, k: 8e-3, coulomb: coulomb, viscous: 2e-7}
				off, allowed := constantSpeed(&l, duty, ratio)
				worst[ratio >= rippleLimit] = math.Max(worst[ratio >= rippleLimit], off)
				if off > allowed {
					t.Errorf("duty %.2f, T/τm %.2f, %g N m: off by %.3f %%, allowed %.3f %%", duty, ratio, coulomb, 100*off, 100*allowed)
				}
			}
		}
	}
	t.Logf("worst below the limit %.3f %%, above it %.2f %%", 100*worst[false], 100*worst[true])
}

// constantSpeed is the largest relative error of current, voltage and speed, and what is allowed.
func constantSpeed(l *load, duty, ratio float64) (off, allowed float64) {
	const period = 2e-3
	l.inertia = period / ratio * l.k * l.k / l.r
	c := cycle{on: duty * period, off: (1 - duty) * period, r: l.r, l: l.l}
	c.sources[driven], c.sources[free] = source{v: 9}, source{v: -0.7}
	emf, w := l.balance(&c)
	i, v, s := turning(l, &c, emf)
	for _, e := range []float64{w.current()/i - 1, w.voltage()/v - 1, emf/l.k/s - 1} {
		off = math.Max(off, math.Abs(e))
	}
	if ratio < rippleLimit {
		return off, 0.01
	}
	return off, math.Min(0.5, ratio*duty*(1-duty)/2)
}
