package pulse

import (
	"math"
	"testing"
)

// A level between two codes, with a fifth of a step of noise: the mean of the codes is
// drawn towards the nearer one, the level is not.
func TestLevelAmongFewCodes(t *testing.T) {
	s := timer()
	s.bits, s.bottom, s.span = 5, -1, 16 // half a volt a step
	s.n, s.interval = 4000, 1.003e-5
	for _, s.high = range []float64{8.5, 8.6, 8.7, 8.8} {
		s.noise = 0.1
		r := analyse(t, s.capture(rng()), Options{})
		q := quantity(t, r, "high_level")
		agrees(t, r, "high_level", s.high)
		agrees(t, r, "average_voltage", s.mean())
		agrees(t, r, "rms", math.Sqrt(s.duty*sq(s.high)+(1-s.duty)*sq(s.low)))
		if q.U() > 0.3*0.5 {
			t.Errorf("high level %.3f V: u %.3f V is no better than one code's", s.high, q.U())
		}
	}
}

// Without noise a code is all that is known: half a volt over √12.
func TestLevelWithoutNoise(t *testing.T) {
	s := timer()
	s.bits, s.bottom, s.span, s.noise = 5, -1, 16, 0
	r := analyse(t, s.capture(rng()), Options{})
	agrees(t, r, "high_level", s.high)
	if u := quantity(t, r, "high_level").U(); u < 0.2*0.5 || u > 0.31*0.5 {
		t.Errorf("u %.3f V", u)
	}
}

// A tail that takes long to die puts samples on other codes too; that is no noise.
func TestTailIsNoNoise(t *testing.T) {
	s := timer()
	s.bits, s.bottom, s.span, s.noise = 8, -2, 16, 0
	s.up, s.down = exponential(1.2e-4), exponential(1.2e-4)
	s.n, s.interval = 4000, 1.003e-6
	for _, s.high = range []float64{8.70, 8.72, 8.74, 8.76} {
		r := analyse(t, s.capture(rng()), Options{})
		agrees(t, r, "high_level", s.high)
		agrees(t, r, "low_level", s.low)
	}
}
