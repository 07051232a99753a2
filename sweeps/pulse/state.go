package pulse

import "math"

// span is a stretch of samples within one state, ends included.
type span struct{ from, to int }

// spans lists the occurrences of the high or the low state between the edges,
// with the cut ones at the ends of the record.
func spans(edges []edge, high bool, n int) []span {
	var out []span
	for k, e := range edges {
		if k == 0 && e.rising != high {
			out = append(out, span{0, before(e, 0)})
		}
		if e.rising != high {
			continue
		}
		end := n - 1
		if k+1 < len(edges) {
			end = before(edges[k+1], e.to)
		}
		out = append(out, span{e.to, end})
	}
	return out
}

// state is what the samples within one state say about its level, in codes.
type state struct {
	level   float64
	n       int     // samples used
	noise   float64 // variance between neighbouring samples: white noise and rounding
	pairs   int     // neighbour pairs the noise came from
	spread  float64 // variance of all samples used
	uRandom float64 // standard uncertainty of level from scatter
	dof     float64
	uRound  float64 // … from the converter's steps
	uSettle float64 // … from a level still moving
	outer   int     // samples a converter step or more away from the level
	equal   int     // pairs of equal neighbours
	shelf   float64 // level early in the occurrences, in the part left out, less the level
	uShelf  float64
	droop   float64 // level early in the state less level late in it
	uDroop  float64
	shift   float64 // what the converter's steps had drawn the mean of the codes away from level

	coarse float64 // what the steps leave unknown of the mean of the codes
	fine   float64 // noise variance, freed of what a slow part changes between neighbours
	own    float64 // noise before it was pooled with that of other states

	occ           []span // where it was measured, and how
	about, within float64
	skip          float64
}

// before is the last sample of a state that is clear of the transition ending it: three
// times as far before its 50 % instant as its first tenth is, if that leaves three quarters
// of the state since its first sample. The state boundary does not serve: a sagging
// top leaves it early.
func before(e edge, since int) int {
	start := min(e.tenth, e.ninth)
	clear := int(math.Floor(e.mid-3*(e.mid-start))) - 1
	longest := int(math.Ceil(start)) - 1
	return max(since, min(longest, max(clear, since+(longest-since)*3/4)))
}

const (
	mostSpans   = 64   // occurrences looked at, spread over the record
	mostSamples = 1024 // samples looked at in one occurrence, spread over it
)

// sums gathers what one pass over a stretch of samples needs.
type sums struct {
	n, pairs      int
	y, yy, diff   float64
	diff2         float64 // of samples two apart
	pairs2        int
	early, late   float64
	nEarly, nLate int
	outer, equal  int
	first         float64
	nFirst        int
}

// measureState averages the settled part of the occurrences: the first share
// skip of each is left out, as are samples farther than reach codes from about
// (spikes). step is the distance between codes that occur.
func measureState(codes []int16, occ []span, about, reach, skip float64, step int) state {
	st := state{level: about, dof: math.Inf(1), occ: occ, about: about, within: reach, skip: skip}
	var means, weights []float64
	var total sums
	stride := (len(occ) + mostSpans - 1) / mostSpans
	for k := 0; k < len(occ); k += max(1, stride) {
		s := sumSpan(codes, occ[k], about, reach, skip, float64(step))
		if s.n == 0 {
			continue
		}
		total.add(s)
		means, weights = append(means, s.y/float64(s.n)), append(weights, float64(s.n))
	}
	if total.n == 0 {
		st.uRandom, st.dof, st.uRound = reach/math.Sqrt(3), 1, float64(step)/math.Sqrt(12)
		return st
	}
	n := float64(total.n)
	off := total.y / n
	st.n, st.pairs, st.level = total.n, total.pairs, about+off
	st.outer, st.equal = total.outer, total.equal
	st.spread = max(0, total.yy/n-off*off)
	if total.pairs > 0 {
		st.noise = total.diff / (2 * float64(total.pairs))
		st.own, st.fine = st.noise, st.noise
		if total.pairs2 > 0 {
			// A slow part differs four times as much, squared, two samples apart as one.
			st.fine = max(0, (4*st.noise-total.diff2/(2*float64(total.pairs2)))/3)
		}
	}
	if total.nFirst > 0 {
		st.shelf = total.first/float64(total.nFirst) - off
		st.uShelf = math.Sqrt(st.noise * (1/n + 1/float64(total.nFirst)))
	}
	st.scatter(means, weights)
	st.trend(total)
	return st
}

// each gives the samples the state was measured by, and where they stand in the settled part, from 0 to 1.
func (st *state) each(codes []int16, f func(c int16, place float64)) {
	stride := (len(st.occ) + mostSpans - 1) / mostSpans
	for k := 0; k < len(st.occ); k += max(1, stride) {
		from, step := settledFrom(st.occ[k], st.skip)
		for i := from; i <= st.occ[k].to; i += step {
			if math.Abs(float64(codes[i])-st.about) <= st.within {
				f(codes[i], (float64(i-from)+0.5)/float64(st.occ[k].to-from+1))
			}
		}
	}
}

// settledFrom is the first sample looked at of an occurrence, and the distance to the next.
func settledFrom(o span, skip float64) (from, step int) {
	from = o.from + int(skip*float64(o.to-o.from+1))
	return from, max(1, (o.to-from+mostSamples)/mostSamples)
}

func sumSpan(codes []int16, o span, about, reach, skip, step float64) sums {
	var s sums
	from, stride := settledFrom(o, skip)
	half := from + (o.to-from)/2
	s.shelf(codes, o, about, reach)
	for i := from; i <= o.to; i += stride {
		y := float64(codes[i]) - about
		if math.Abs(y) > reach {
			continue
		}
		if math.Abs(y) >= step {
			s.outer++
		}
		s.n++
		s.y += y
		s.yy += y * y
		if i <= half {
			s.early += y
			s.nEarly++
		} else {
			s.late += y
			s.nLate++
		}
		if i < o.to {
			if d := float64(codes[i+1]) - about - y; math.Abs(d) <= 2*reach {
				s.diff += d * d
				s.pairs++
				if d == 0 {
					s.equal++
				}
			}
			if i+2 <= o.to {
				if d := float64(codes[i+2]) - about - y; math.Abs(d) <= 2*reach {
					s.diff2 += d * d
					s.pairs2++
				}
			}
		}
	}
	return s
}

// shelf sums a little of the part left out, from 15 % to 35 % of the state, where a level of its own may hide.
func (s *sums) shelf(codes []int16, o span, about, reach float64) {
	length := o.to - o.from + 1
	if length < 8 {
		return
	}
	from, to := o.from+length*15/100, o.from+length*35/100
	for i := from; i < to; i += 1 + (to-from)/64 {
		if y := float64(codes[i]) - about; math.Abs(y) <= reach {
			s.first += y
			s.nFirst++
		}
	}
}

func (s *sums) add(o sums) {
	s.n += o.n
	s.pairs += o.pairs
	s.y += o.y
	s.yy += o.yy
	s.diff += o.diff
	s.diff2 += o.diff2
	s.pairs2 += o.pairs2
	s.early += o.early
	s.late += o.late
	s.nEarly += o.nEarly
	s.nLate += o.nLate
	s.first += o.first
	s.nFirst += o.nFirst
	s.outer += o.outer
	s.equal += o.equal
}

// scatter sets the random uncertainty: that of white noise over all samples, or,
// when the occurrences scatter more than white noise would let them, that of their means.
func (st *state) scatter(means, weights []float64) {
	n, j := float64(st.n), float64(len(means))
	white := st.noise / n
	st.uRandom, st.dof = math.Sqrt(white), max(1, float64(st.pairs-1))
	slow := st.spread - st.noise
	if slow > st.noise*3*math.Sqrt(2/n) && len(means) < 8 {
		// Too few occurrences to see their scatter; each is one draw of the slow part.
		st.uRandom = math.Hypot(st.uRandom, math.Sqrt(slow/j)/2)
		return
	}
	if len(means) < 8 {
		return
	}
	mean := st.meanOf(means, weights)
	var between float64
	for i, m := range means {
		between += weights[i] * weights[i] * (m - mean) * (m - mean)
	}
	between /= n * n
	if between > white*(1+3*math.Sqrt(2/j)) {
		st.uRandom, st.dof = math.Sqrt(between*j/(j-1)), j-1
	}
}

func (st *state) meanOf(means, weights []float64) float64 {
	var s, w float64
	for i, m := range means {
		s += m * weights[i]
		w += weights[i]
	}
	return s / w
}

// trend compares the earlier with the later half of the settled part.
func (st *state) trend(t sums) {
	if t.nEarly == 0 || t.nLate == 0 {
		return
	}
	d := t.early/float64(t.nEarly) - t.late/float64(t.nLate)
	u2 := st.noise * (1/float64(t.nEarly) + 1/float64(t.nLate))
	st.droop, st.uDroop = d, math.Sqrt(u2)
	// A level still approaching its end value lies beyond the later half by about the same again.
	st.uSettle = 0.8 * math.Sqrt(max(0, d*d-4*u2))
}

// rounding sets the uncertainty left by the converter's steps of q codes: q/√12
// without noise, vanishing once noise spreads the samples over several codes.
func (st *state) rounding(q float64) {
	st.uRound = q * sawtooth(max(0, st.noise/q/q-1.0/12))
	// Two codes alone may be a little noise astride a threshold, which rounds the mean towards it.
	if st.outer <= st.n/200 {
		st.uRound = max(st.uRound, 0.2*q)
	}
	if st.equal*10 > 9*st.pairs {
		st.uRound = q / math.Sqrt(12)
	}
	st.coarse = st.uRound
}

// slow is the variance, codes², of what varies in the state more slowly than noise; 0 when not significantly.
func (st *state) slow() float64 {
	v := st.spread - st.fine
	if v < 4*st.fine/math.Sqrt(float64(max(1, st.n))) {
		return 0
	}
	return v
}

// root returns the square root of a variance known to u of variance, and its standard
// uncertainty. Near zero the root follows the posterior of a quantity that cannot be
// negative, flat in the root: for a variance of 0 its density is as exp(−r⁴/2u²), whose rms is 0.69 √u.
// Up to a variance of 4 u a root of 0 stays possible: it is kept within reach, a quarter of the root.
func root(variance, u float64) (r, uRoot float64) {
	r = math.Sqrt(max(0, variance))
	uRoot = u / 2 / max(r, 1e-300)
	if variance < 4*u {
		uRoot = max(uRoot, r/4)
	}
	return r, min(0.69*math.Sqrt(u), uRoot)
}

// sawtooth is the rms error, in steps, of the mean of readings rounded to whole
// steps when Gaussian noise of the given variance (steps²) precedes the rounding:
// the Fourier series of the sawtooth, each harmonic damped by the noise.
func sawtooth(variance float64) float64 {
	var sum float64
	for m := 1.0; m <= 40; m++ {
		damp := math.Exp(-4 * math.Pi * math.Pi * m * m * variance)
		sum += damp / (2 * math.Pi * math.Pi * m * m)
		if damp < 1e-9 {
			break
		}
	}
	return math.Sqrt(sum)
}
