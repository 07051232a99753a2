package pulse

import (
	"math"

	"nightbench/sweeps/uncertainty"
)

// aberrations adds overshoot after rising and undershoot after falling transitions, as
// ratios of the amplitude. The post-transition region is three transition
// durations long, at least a third of the state (IEEE Std 181 leaves its length to the user).
func (a *analysis) aberrations(c cycles) {
	w := a.high.level - a.low.level
	occ := func(high bool) []span { return spans(a.driven.edges, high, len(a.codes)) }
	a.add(a.aberration("overshoot", occ(true), a.high, w, 1))
	low := occ(false)
	if a.three {
		low = spans(a.freewheel.edges, false, len(a.codes))
	}
	a.add(a.aberration("undershoot", low, a.low, w, -1))
}

func (a *analysis) aberration(name string, occ []span, s state, w, sign float64) Quantity {
	var peaks []float64
	stride := max(1, len(occ)/64)
	looked := 1
	for k := 0; k < len(occ); k += stride {
		o := occ[k]
		if o.from == 0 {
			continue // begins before the record
		}
		n := max(3, (o.to-o.from+1)/3)
		end := min(o.from+n, o.to)
		looked = max(looked, end-o.from+1)
		peaks = append(peaks, a.peak(o.from, end, sign)-sign*s.level)
	}
	if len(peaks) == 0 {
		peaks = []float64{0}
	}
	n := float64(len(peaks))
	sigma := math.Sqrt(max(a.noise, a.q*a.q/12))
	// The largest of k noisy samples of a flat top lies √(2 ln k) σ above it, that of a sharp peak hardly.
	flat := math.Sqrt(2*math.Log(float64(max(2, looked)))) * sigma
	over := mean(peaks)
	bias := flat / 2
	if over > 3*flat {
		bias = 0.4 * sigma
	}
	x := max(0, over-bias)
	scatter := max(sigma, deviation(peaks)) / math.Sqrt(n)
	return a.quantity(name, "1", x/w, 0, 0, 0,
		uncertainty.Scatter("noise", uncertainty.Value{U: scatter / w, DOF: max(1, n-1)}),
		uncertainty.Known("peak of noise", bias/math.Sqrt(3)/w),
		uncertainty.Known("sample interval", 0.05*x/w),
		uncertainty.Known("state levels", a.uLevel(s)/w))
}

// peak is the highest value (of sign × code) in [from, to], the top of the parabola
// through it and its neighbours.
func (a *analysis) peak(from, to int, sign float64) float64 {
	best := from
	for i := from; i <= to; i++ {
		if sign*float64(a.codes[i]) > sign*float64(a.codes[best]) {
			best = i
		}
	}
	y := sign * float64(a.codes[best])
	if best == 0 || best == len(a.codes)-1 {
		return y
	}
	l, r := sign*float64(a.codes[best-1]), sign*float64(a.codes[best+1])
	bend := l - 2*y + r
	if bend >= 0 {
		return y
	}
	return y + min(-sq(r-l)/(8*bend), 0.3*(y-min(l, r)))
}
