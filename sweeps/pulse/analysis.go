package pulse

import (
	"fmt"
	"math"
)

// analysis carries one record through the steps of the standard: state levels,
// transitions, whole periods, parameters.
type analysis struct {
	trace
	options   Options
	h         histogram
	q         float64 // codes between values that occur
	noise     float64 // variance of white noise, codes²
	pairs     int     // neighbour pairs it was estimated from
	low, high state
	rest      state // of three levels
	driven    scanner
	freewheel scanner // of three levels: transitions between freewheel and rest
	three     bool
	resolved  bool // levels were read from how the samples spread over few codes
	result    Result
}

func (a *analysis) run() {
	a.h = newHistogram(a.codes)
	a.q = float64(a.h.step)
	a.result.Flags = append(a.result.Flags, a.flags...)
	a.checkClipping()
	g := guessLevels(a.codes, a.h)
	if g.three == nil || a.result.Flagged(Clipped) && a.atRail(g) || !a.threeLevels(g) {
		if a.flat(g) {
			if a.wanders() {
				a.notPulses()
			} else {
				a.constant()
			}
			return
		}
		if g.three != nil {
			a.flagThird()
		}
		low, high := a.bestPair(g)
		a.twoLevels(low, high, g.noise)
	}
	a.result.Middle = a.volts((a.driven.low + a.driven.high) / 2)
	a.judgeLevels()
	if len(a.driven.edges) < 3 || a.slow() {
		a.notPulses()
		return
	}
	a.instants()
	a.measure()
}

func (a *analysis) flag(name, format string, args ...any) Flag {
	f := Flag{name, fmt.Sprintf(format, args...)}
	if !a.result.Flagged(name) {
		a.result.Flags = append(a.result.Flags, f)
	}
	return f
}

// flat tells whether the record shows one level only: the two halves of its range
// are no farther apart than their own spread explains. For Gaussian noise the
// ratio is 2.65, for a triangle 3.5, for a sine 4.1.
func (a *analysis) flat(g guess) bool {
	if g.high-g.low < 1.5*a.q {
		return true
	}
	split := (g.low + g.high) / 2
	n0, m0, v0 := a.h.moments(float64(a.h.low), split)
	n1, m1, v1 := a.h.moments(split+1e-9, float64(a.h.high()))
	within := math.Sqrt((float64(n0)*v0 + float64(n1)*v1) / float64(n0+n1))
	limit := 3.2
	if n0+n1 < 60 {
		limit = 4.5
	}
	return m1-m0 < limit*within
}

// wanders tells a ramp or a walk from a level with noise or hum on it: it moves far more
// than neighbouring samples do, and by a fair part of its height.
func (a *analysis) wanders() bool {
	_, mean, variance := a.h.moments(float64(a.h.low), float64(a.h.high()))
	moves := math.Sqrt(variance)
	return moves > 3*max(neighbourNoise(a.codes), a.q) && moves*a.volt > 0.1*max(math.Abs(a.volts(mean)), math.Abs(a.options.Expected))
}

// moments returns count, mean and variance of the codes within [from, to].
func (h histogram) moments(from, to float64) (n int, mean, variance float64) {
	n, sum := h.within(from, to)
	if n == 0 {
		return 0, from, 0
	}
	mean = sum / float64(n)
	a, b := max(0, int(math.Ceil(from))-h.low), min(len(h.count)-1, int(math.Floor(to))-h.low)
	for i := a; i <= b; i++ {
		d := float64(i+h.low) - mean
		variance += float64(h.count[i]) * d * d
	}
	return n, mean, variance / float64(n)
}

// bound is the distance of the state boundaries from the levels: 2 % of the
// amplitude, or as much as noise and rounding need, but never a third of it.
func (a *analysis) bound(low, high, noise float64) float64 {
	return min(0.3*(high-low), max(0.02*(high-low), 3.5*noise+0.5*a.q))
}

func (a *analysis) flagThird() {
	a.flag(ThirdLevel, "there may be a third level, too short or too close to another to be told from ringing; a faster time base or a smaller range would show it")
}

// atRail tells whether the lowest or the highest level is the end of the converter's
// range, where whatever went beyond looks like a level.
func (a *analysis) atRail(g guess) bool {
	reach := float64(g.width) + a.q
	return g.three[0]-reach < float64(a.clipLow) || g.three[2]+reach > float64(a.clipHigh)
}

// bestPair chooses two levels where the histogram shows three that are not driven,
// freewheel and rest: the pair nearest to which most samples lie. The third is then ringing or
// a freewheel too short to see.
func (a *analysis) bestPair(g guess) (low, high float64) {
	low, high = g.low, g.high
	if g.three == nil {
		return low, high
	}
	t := g.three
	near := func(x float64) int {
		reach := max(float64(g.width), 3*g.noise, 0.02*(t[2]-t[0]))
		n, _ := a.h.within(x-reach, x+reach)
		return n
	}
	best := near(low) + near(high)
	for _, pair := range [][2]float64{{t[0], t[2]}, {t[0], t[1]}, {t[1], t[2]}} {
		if n := near(pair[0]) + near(pair[1]); 10*n > 11*best {
			best, low, high = n, pair[0], pair[1]
		}
	}
	return low, high
}

// twoLevels finds the transitions between two levels and refines the levels from
// the settled part of each state, as the transitions delimit it.
func (a *analysis) twoLevels(low, high, noise float64) {
	loose := false
	for range 3 {
		bound := a.bound(low, high, noise)
		if loose {
			bound = 0.3 * (high - low)
		}
		a.driven = scanner{codes: a.codes, low: low, high: high, bound: bound}
		a.driven.scan()
		if !loose && (len(a.driven.edges) < 3 || a.driven.runts > len(a.driven.edges)) {
			loose = true
			a.driven = scanner{codes: a.codes, low: low, high: high, bound: 0.3 * (high - low)}
			a.driven.scan()
		}
		a.measureTwo(low, high)
		moved := max(math.Abs(a.low.level-low), math.Abs(a.high.level-high))
		low, high = a.low.level, a.high.level
		// Slow changes of a level, such as of the supply, widen its state as noise does, up to a point.
		noise = max(math.Sqrt(a.noise), min(math.Sqrt(max(a.low.spread, a.high.spread)), 0.03*(high-low)))
		if moved < 0.002*(high-low) || moved < 0.1*a.q {
			break
		}
	}
	a.driven.low, a.driven.high = low, high
	if a.tidy(&a.driven) {
		a.measureTwo(low, high)
	}
}

// tidy locates the instants for the final levels, removes notches and flags notches
// and runts. It tells whether notches were removed.
func (a *analysis) tidy(s *scanner) (changed bool) {
	s.locate()
	n := s.removeNotches()
	if n > 0 {
		a.flag(Notch, "%d short excursions to the other state were taken for disturbances and left out", n)
	}
	if s.runts > 0 {
		a.flag(Runt, "%d pulses passed the middle without reaching the other state; they were not counted", s.runts)
	}
	return n > 0
}

func (a *analysis) measureTwo(low, high float64) {
	edges, n := a.driven.edges, len(a.codes)
	if len(edges) == 0 {
		a.low, a.high = state{level: low, dof: 1, uRound: a.q}, state{level: high, dof: 1, uRound: a.q}
		return
	}
	a.low = a.settled(spans(edges, false, n), low, high-low)
	a.high = a.settled(spans(edges, true, n), high, high-low)
	a.pool(&a.low, &a.high)
}

// settled measures a state over its last three fifths, spikes left out.
func (a *analysis) settled(occ []span, about, amplitude float64) state {
	st := measureState(a.codes, thinned(occ, 12), about, 0.35*amplitude, 0.4, a.h.step)
	reach := min(0.35*amplitude, max(4.5*math.Sqrt(st.spread), 1.5*a.q))
	return measureState(a.codes, occ, st.level, reach, 0.4, a.h.step)
}

// thinned takes at most n of the occurrences, spread over all: enough to learn how wide a state is.
func thinned(occ []span, n int) []span {
	if len(occ) <= n {
		return occ
	}
	out := make([]span, n)
	for i := range out {
		out[i] = occ[i*len(occ)/n]
	}
	return out
}

// pool shares the noise among states: the scope's is the same in all, and with
// few samples no state can tell it alone. Rounding follows from it.
func (a *analysis) pool(states ...*state) {
	var sum float64
	a.pairs = 0
	for _, s := range states {
		sum += s.noise * float64(s.pairs)
		a.pairs += s.pairs
	}
	a.noise = 0
	if a.pairs > 0 {
		a.noise = sum / float64(a.pairs)
	}
	for _, s := range states {
		if s.pairs < 30 && s.n > 0 {
			s.noise = a.noise
			s.uRandom = max(s.uRandom, math.Sqrt(a.noise/float64(s.n)))
			s.dof = max(s.dof, float64(a.pairs-1), 1)
		}
		s.rounding(a.q)
	}
	a.resolve(states...)
	for _, s := range states {
		s.uRound = math.Hypot(s.uRound, a.printed)
	}
}

func (a *analysis) instants() {
	a.result.Instants = make([]Instant, len(a.driven.edges))
	for i, e := range a.driven.edges {
		a.result.Instants[i] = Instant{a.at(e.mid), e.rising}
	}
}
