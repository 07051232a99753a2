package predict

import (
	"math"
	"math/rand/v2"
	"testing"

	"nightbench/sweeps"
	"nightbench/sweeps/internal/numeric"
)

// One diode and a constant leak have an exact form: with i(V) from the Wright omega
// function, T = C·[R·ln((i1+L)/(i2+L)) + n·Vt·∫ di/((i+Is)(i+L))], the integral elementary.
func TestOneDiodeAndALeakInClosedForm(t *testing.T) {
	vt := boltzmann * reference / elementary
	rule := numeric.GaussLegendre(quadraturePoints)
	for _, c := range []struct{ r, is, n, leak, v0, v1, source float64 }{
		{10e3, 2.52e-9, 1.752, 1e-6, 3, 6, 9},
		{100e3, 2.1e-7, 1.02, 5e-6, 1.6, 3.2, 5},
		{1e3, 3.17e-5, 1.373, 2e-5, 1.5, 3, 4.5},
	} {
		nvt := c.n * vt
		current := func(v float64) float64 { // through diode and resistor with source − v across them and the leak's drop
			drive := c.source - v - c.r*c.leak
			return nvt/c.r*numeric.Omega(math.Log(c.is*c.r/nvt)+(drive+c.is*c.r)/nvt) - c.is
		}
		i1, i2 := current(c.v0), current(c.v1)
		const farad = 1e-7
		integral := math.Log((i1+c.leak)/(i2+c.leak)*(i2+c.is)/(i1+c.is)) / (c.is - c.leak)
		exact := farad * (c.r*math.Log((i1+c.leak)/(i2+c.leak)) + nvt*integral)
		l := law{sign: 1, source: c.source - c.r*c.leak, r: c.r, bias: c.leak, c: farad,
			on: branch{is: c.is, nvt: nvt, see: 1}, other: nothing}
		near(t, "time", l.time(&rule, l.end(c.v0), l.end(c.v1)), exact, 1e-9)
	}
}

// Wherever Newton's method arrives, bisection arrives too.
func TestEndPointsByTwoMethods(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 0))
	for n := range 300 {
		b, s, o := randomBoard(r, []sweeps.Network{sweeps.Plain, sweeps.Bypassed, sweeps.Steered, sweeps.Wiper, sweeps.OutputFed}[n%5])
		m := mustNew(t, b, o)
		p, c := m.nominal, s.conditions()
		m.warm(&p, c.kelvin)
		out := output{c.supply, m.drop, m.low, 1, 1, 0, true, 0}
		charge, discharge := m.laws(&p, &c, &out, 0, 0)
		for _, l := range []*law{&charge, &discharge} {
			for _, v := range []float64{c.supply / 3, c.supply / 2, 2 * c.supply / 3} {
				x := l.find(v)
				if at, _, _ := l.at(x); math.Abs(at-v) > 1e-9*c.supply {
					t.Fatalf("board %d: at x = %g the capacitor is at %g V, wanted %g", n, x, at, v)
				}
				if span := l.span(v); span > 0 {
					beyond := span / math.Max(l.r+l.on.r, 1e-9)
					if l.on.nvt > 0 {
						beyond = span
					}
					if y := l.bisect(v, 0, beyond); math.Abs(x-y) > 1e-9*(math.Abs(x)+l.on.nvt) {
						t.Fatalf("board %d: found %g and %g", n, x, y)
					}
				}
			}
		}
	}
}

// A leak behind a resistance: the omega form against its own node equation, shunt and all.
func TestLeakBehindAResistance(t *testing.T) {
	vt := boltzmann * reference / elementary
	for _, d := range []diode{{is: 3.17e-5, n: 1.373, rs: 0.05}, {is: 2.52e-9, n: 1.752}, {is: 2e-7, n: 1.02, rs: 2, shunt: 1e6}} {
		d.nvt = d.n * vt
		for _, r := range []float64{0, 100, 10e3, 1e6} {
			b := newBranch(r, d)
			for _, w := range []float64{0.001, 0.1, 1, 5} {
				i, g := b.against(w)
				y := w - b.r*i // across the junction
				want := -d.is * math.Expm1(-y/d.nvt)
				if d.shunt > 0 {
					want += y / d.shunt
				}
				near(t, "leak", i, want, 1e-6)
				up, _ := b.against(w + 1e-6)
				down, _ := b.against(w - 1e-6)
				if slope := (up - down) / 2e-6; math.Abs(slope-g) > 1e-3*math.Abs(slope)+1e-9*b.is/d.nvt+1e-13 {
					t.Errorf("slope %g, by difference %g; %g ohm, %g V, %+v", g, slope, r, w, d)
				}
			}
		}
	}
}
