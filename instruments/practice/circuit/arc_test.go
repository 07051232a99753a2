package circuit

import (
	"math"
	"testing"
)

// TestPhi compares with the defining series Σ z^n/(n+k)!.
func TestPhi(t *testing.T) {
	for _, z := range []float64{-8, -1, -0.0501, -0.0499, -0.02, -1e-3, -1e-6, 0, 1e-9, 1e-4, 0.3, 2} {
		for k, phi := range []func(float64) float64{phi1, phi2, phi3} {
			want, term := 0.0, 1/math.Gamma(float64(k+2))
			for n := range 80 {
				want += term
				term *= z / float64(n+k+2)
			}
			if got := phi(z); math.Abs(got-want) > 1e-10*math.Abs(want) {
				t.Errorf("φ%d(%g) = %.15g, want %.15g", k+1, z, got, want)
			}
		}
	}
}

// TestArc is a capacitor charging through a resistor: v = V (1 − e^(−t/RC)).
func TestArc(t *testing.T) {
	const rc = 1e-3
	a := arc{F: 9 / rc, J: -1 / rc}
	a.span(2e-3)
	v := func(t float64) float64 { return 9 * (1 - math.Exp(-t/rc)) }
	for _, at := range []float64{0, 1e-7, 1e-4, 1e-3, 2e-3} {
		if math.Abs(a.at(at)-v(at)) > 1e-12 {
			t.Errorf("at %g s: %g V, want %g V", at, a.at(at), v(at))
		}
	}
	mean := func(t float64) float64 { return 9 * (1 - rc/t*(1-math.Exp(-t/rc))) }
	near(t, "mean of the step", a.mean(0, 2e-3), mean(2e-3), 1e-12)
	near(t, "mean of its second half", a.mean(1e-3, 2e-3), 2*mean(2e-3)-mean(1e-3), 1e-12)
	near(t, "half voltage", a.reach(4.5), math.Ln2*rc, 1e-12)
	if !math.IsInf(a.reach(9.1), 1) || !math.IsInf(a.reach(-1), 1) {
		t.Error("levels beyond the asymptote or behind the start are never reached")
	}
}

// TestStepIsThirdOrder: one step of v' = −v² from 1; halving the step must
// divide the error of a fixed span by about eight.
func TestStepIsThirdOrder(t *testing.T) {
	off := func(n int) float64 {
		v, h := 1.0, 1/float64(n)
		for range n {
			a := arc{X: v, F: -v * v, J: -2 * v}
			a.span(h)
			fix(&a, func(v float64) float64 { return -v * v })
			v = a.end
		}
		return math.Abs(v - 0.5)
	}
	if r := off(20) / off(40); r < 6.5 || r > 9.5 {
		t.Errorf("halving the step divides the error by %.2f, want 8", r)
	}
}
