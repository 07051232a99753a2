package numeric

import (
	"errors"
	"fmt"
	"math"
)

// ErrNotBracketed means f has the same sign at both ends of the interval.
var ErrNotBracketed = errors.New("root not bracketed")

// ErrNotFinite means f was not a number somewhere in the interval.
var ErrNotFinite = errors.New("function not a number")

// maxBrent bounds the iterations. Bisection alone needs at most about 1,080 to
// separate any two doubles; Brent's method stays far below in practice.
const maxBrent = 200

// Brent returns x in [a, b] where f changes sign, to within tol plus the
// resolution of a double. f(a) and f(b) must differ in sign or one be zero;
// otherwise the error wraps ErrNotBracketed and states both values.
//
// Method: R. P. Brent, Algorithms for Minimization without Derivatives, 1973,
// chapter 4 ("zero"): inverse quadratic interpolation or secant, guarded by
// bisection.
func Brent(f func(float64) float64, a, b, tol float64) (float64, error) {
	s := bracket{a: a, b: b, fa: f(a), fb: f(b)}
	switch {
	case math.IsNaN(s.fa) || math.IsNaN(s.fb):
		return 0, fmt.Errorf("find root in [%g, %g]: %w at an end: %g, %g", a, b, ErrNotFinite, s.fa, s.fb)
	case s.fa == 0:
		return a, nil
	case s.fb == 0:
		return b, nil
	case (s.fa > 0) == (s.fb > 0):
		return 0, fmt.Errorf("find root in [%g, %g]: %w: f is %g and %g at the ends; widen the interval", a, b, ErrNotBracketed, s.fa, s.fb)
	}
	s.c, s.fc = s.a, s.fa
	s.d = s.b - s.a
	s.e = s.d
	for range maxBrent {
		s.order()
		limit := 2*epsilon*math.Abs(s.b) + tol/2
		half := (s.c - s.b) / 2
		if math.Abs(half) <= limit || s.fb == 0 {
			return s.b, nil
		}
		s.step(half, limit)
		if s.fb = f(s.b); math.IsNaN(s.fb) {
			return 0, fmt.Errorf("find root in [%g, %g]: %w at %g", a, b, ErrNotFinite, s.b)
		}
	}
	return s.b, fmt.Errorf("find root in [%g, %g]: not within %g after %d steps; raise the tolerance", a, b, tol, maxBrent)
}

const epsilon = 0x1p-52

// bracket holds Brent's state: b the best estimate, a the one before, c the
// other end of the bracket; d and e the last two steps.
type bracket struct {
	a, b, c, fa, fb, fc, d, e float64
}

// order restores the invariants: f(b) and f(c) differ in sign, |f(b)| is the smaller.
func (s *bracket) order() {
	if (s.fb > 0) == (s.fc > 0) {
		s.c, s.fc = s.a, s.fa
		s.d = s.b - s.a
		s.e = s.d
	}
	if math.Abs(s.fc) < math.Abs(s.fb) {
		s.a, s.b, s.c = s.b, s.c, s.b
		s.fa, s.fb, s.fc = s.fb, s.fc, s.fb
	}
}

// step moves b by interpolation where that shrinks fast enough, else by bisection.
func (s *bracket) step(half, limit float64) {
	s.propose(half, limit)
	s.a, s.fa = s.b, s.fb
	if math.Abs(s.d) > limit {
		s.b += s.d
	} else {
		s.b += math.Copysign(limit, half)
	}
}

func (s *bracket) propose(half, limit float64) {
	if math.Abs(s.e) < limit || math.Abs(s.fa) <= math.Abs(s.fb) {
		s.d, s.e = half, half
		return
	}
	var p, q float64
	r := s.fb / s.fa
	if s.a == s.c {
		p, q = 2*half*r, 1-r
	} else {
		u, v := s.fa/s.fc, s.fb/s.fc
		p = r * (2*half*u*(u-v) - (s.b-s.a)*(v-1))
		q = (u - 1) * (v - 1) * (r - 1)
	}
	if p > 0 {
		q = -q
	}
	p = math.Abs(p)
	if 2*p < min(3*half*q-math.Abs(limit*q), math.Abs(s.e*q)) {
		s.e, s.d = s.d, p/q
		return
	}
	s.d, s.e = half, half
}
