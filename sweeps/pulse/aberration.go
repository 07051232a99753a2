package pulse

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
	"nightbench/sweeps/uncertainty"
)

// aberrations adds overshoot after rising and undershoot after falling transitions, as
// ratios of the amplitude. The post-transition region is the first third of the state,
// at least three samples (IEEE Std 181 leaves its length to the user).
func (a *analysis) aberrations() {
	w := a.high.level - a.low.level
	occ := func(high bool) []span { return spans(a.driven.edges, high, len(a.codes)) }
	a.add(a.aberration("overshoot", occ(true), a.high, w, 1))
	low := occ(false)
	if a.three {
		low = spans(a.freewheel.edges, false, len(a.codes))
	}
	a.add(a.aberration("undershoot", low, a.low, w, -1))
}

// peaks gathers the excursions beyond a level after each of several transitions, in codes.
type peaks struct {
	over   []float64
	sharp  float64 // mean drop from a peak to its higher neighbour
	looked int     // samples looked at after each transition
}

const mostPeaks = 64

func (a *analysis) peaks(occ []span, level, sign float64) peaks {
	var p peaks
	for k := 0; k < len(occ); k += max(1, len(occ)/mostPeaks) {
		o := occ[k]
		if o.from == 0 {
			continue // begins before the record
		}
		end := min(o.from+max(3, (o.to-o.from+1)/3), o.to)
		y, drop := a.peak(o.from, end, sign)
		p.over = append(p.over, y-sign*level)
		p.sharp += drop
		p.looked = max(p.looked, end-o.from+1)
	}
	p.sharp /= float64(max(1, len(p.over)))
	return p
}

func (a *analysis) aberration(name string, occ []span, s state, w, sign float64) Quantity {
	p := a.peaks(occ, s.level, sign)
	n := float64(len(p.over))
	if n == 0 {
		p.over, n = []float64{0}, 1
	}
	sigma := math.Sqrt(max(a.noise, a.q*a.q/12))
	over := mean(p.over)
	flat := highestOf(float64(p.looked)) * sigma
	// On a flat top the largest of all samples is what noise makes it; a peak well above the
	// noise is lifted by that of the two or three samples near its top.
	clear := seen(over, flat, sigma)
	// Small peaks show better in the mean of all transitions, sample by sample.
	course := a.course(occ, s.level, sign)
	one := sigma / math.Sqrt(n)
	flatCourse := highestOf(float64(len(course))) * one
	top := maxOf(course)
	clearCourse := seen(top, flatCourse, one)
	x := clear*(over-0.6*sigma) + (1-clear)*(top-clearCourse*0.6*one-(1-clearCourse)*flatCourse)
	peak := clear*0.1*flat + (1-clear)*0.2*flatCourse
	missed := 0.0
	if p.sharp > 0.2*over && over > flat+2*sigma {
		// Ringing so fast that samples miss its peak: the highest of all transitions is nearer to it.
		highest := maxOf(p.over) - highestOf(n)*sigma - 0.6*sigma
		missed = 0.3*min(p.sharp, over)/math.Sqrt(n) + 0.3*max(0, highest-x)
		x = max(x, highest)
		a.flag(FastRinging, "ringing is too fast for the sample interval: overshoot may be larger than given")
	}
	if x > 0.6*w {
		a.flagThird()
	}
	scatter := clear*max(sigma*0.6, deviation(p.over))/math.Sqrt(n) + (1-clear)*0.5*one
	steps := a.q / math.Sqrt(12)
	if a.noise > sq(0.4*a.q) {
		steps /= math.Sqrt(n) // the noise makes each transition's step another
	}
	return a.quantity(name, "1", max(0, x)/w, 0, 0, 0,
		uncertainty.Scatter("noise", uncertainty.Value{U: scatter / w, DOF: max(1, n-1)}),
		uncertainty.Known("peak of noise", peak/w),
		uncertainty.Known("sample interval", (missed+0.03*max(0, x))/w),
		uncertainty.Known("state levels", math.Hypot(a.uLevel(s), steps)/w))
}

// seen tells, from 0 to 1, how far a peak stands out of what noise of sigma makes of a flat top.
func seen(peak, flat, sigma float64) float64 {
	return min(1, max(0, (peak-flat)/(2*sigma+flat)))
}

// course is the mean, over the transitions, of the samples that follow each, less the level, in codes.
func (a *analysis) course(occ []span, level, sign float64) []float64 {
	const longest = 512
	var sum, count []float64
	for k := 0; k < len(occ); k += max(1, len(occ)/mostPeaks) {
		o := occ[k]
		if o.from == 0 {
			continue // begins before the record
		}
		end := min(o.from+max(3, (o.to-o.from+1)/3), o.to, o.from+longest-1)
		for i := o.from; i <= end; i++ {
			if i-o.from == len(sum) {
				sum, count = append(sum, 0), append(count, 0)
			}
			sum[i-o.from] += sign * (float64(a.codes[i]) - level)
			count[i-o.from]++
		}
	}
	for j := range sum {
		sum[j] /= count[j]
	}
	if len(sum) == 0 {
		return []float64{0}
	}
	return sum
}

// highestOf is the expected largest of n standard normal values (Blom 1958).
func highestOf(n float64) float64 {
	if n <= 1 {
		return 0
	}
	return distuv.UnitNormal.Quantile((n - 0.375) / (n + 0.25))
}

func maxOf(values []float64) float64 {
	m := values[0]
	for _, v := range values {
		m = max(m, v)
	}
	return m
}

// peak is the highest value (of sign × code) in [from, to], the top of the parabola
// through it and its neighbours, and how far it stands above the higher neighbour.
func (a *analysis) peak(from, to int, sign float64) (top, drop float64) {
	best := from
	for i := from; i <= to; i++ {
		if sign*float64(a.codes[i]) > sign*float64(a.codes[best]) {
			best = i
		}
	}
	y := sign * float64(a.codes[best])
	if best == 0 || best == len(a.codes)-1 {
		return y, 0
	}
	l, r := sign*float64(a.codes[best-1]), sign*float64(a.codes[best+1])
	drop = y - max(l, r)
	bend := l - 2*y + r
	if bend >= 0 || best == from {
		return y, drop
	}
	return y + min(-sq(r-l)/(8*bend), 0.3*(y-min(l, r))), drop
}
