package pulse

import (
	"slices"
)

// threeLevels tries the record as freewheel and rest: every period must go from
// rest to driven, fall to freewheel and come back to rest. False: it does not.
func (a *analysis) threeLevels(g guess) bool {
	low, mid, high := g.three[0], g.three[1], g.three[2]
	n := len(a.codes)
	for range 2 {
		a.driven = scanner{codes: a.codes, low: mid, high: high, bound: a.bound(mid, high, g.noise)}
		a.freewheel = scanner{codes: a.codes, low: low, high: mid, bound: a.bound(low, mid, g.noise)}
		a.driven.scan()
		a.freewheel.scan()
		if !follows(a.driven.edges, a.freewheel.edges) {
			return false
		}
		a.high = a.settled(spans(a.driven.edges, true, n), high, high-mid)
		a.low = a.settled(spans(a.freewheel.edges, false, n), low, mid-low)
		a.rest = a.settled(restSpans(a.driven.edges, a.freewheel.edges), mid, min(high-mid, mid-low))
		if !flatBottomed(a.freewheel.edges) || !rests(a.driven.edges, a.freewheel.edges) || shorter(spans(a.driven.edges, true, n), 3) {
			return false
		}
		if !plateau(a.low, mid-low) || !plateau(a.high, high-mid) || !plateau(a.rest, min(high-mid, mid-low)) {
			return false
		}
		low, mid, high = a.low.level, a.rest.level, a.high.level
	}
	a.pool(&a.low, &a.high, &a.rest)
	a.driven.low, a.driven.high = mid, high
	a.freewheel.low, a.freewheel.high = low, mid
	for _, s := range []*scanner{&a.driven, &a.freewheel} {
		probe := scanner{codes: a.codes, low: s.low, high: s.high, edges: slices.Clone(s.edges)}
		probe.locate()
		if 10*probe.removeNotches() > len(s.edges) {
			return false // ringing through the level, not a rest at it
		}
	}
	a.tidy(&a.driven)
	a.tidy(&a.freewheel)
	a.relocateFalls()
	a.three = true
	return true
}

// relocateFalls gives the falls from driven to freewheel the 50 % level of that
// transition: they pass the rest level without stopping.
func (a *analysis) relocateFalls() {
	whole := scanner{codes: a.codes, low: a.freewheel.low, high: a.driven.high}
	reached := a.freewheel.low + a.freewheel.bound
	for k := range a.driven.edges {
		e := &a.driven.edges[k]
		if e.rising {
			continue
		}
		end := len(a.codes) - 1
		if k+1 < len(a.driven.edges) {
			end = a.driven.edges[k+1].from
		}
		to := e.to
		for to < end && float64(a.codes[to]) > reached {
			to++
		}
		full := *e
		full.to = to
		whole.locateOne(&full)
		full.to = e.to
		*e = full
	}
}

// plateau tells whether a state holds its level, as the troughs of ringing do not.
func plateau(s state, height float64) bool {
	return s.n >= 4 && s.spread < sq(0.1*height)+2*s.noise
}

// flatBottomed tells whether the low occurrences last three samples and are not short
// beside their transitions, as the troughs of ringing are.
func flatBottomed(edges []edge) bool {
	var flat, slope []float64
	for k := 1; k < len(edges); k++ {
		if fall, rise := edges[k-1], edges[k]; rise.rising {
			flat = append(flat, float64(rise.from-fall.to+1))
			slope = append(slope, float64(fall.to-fall.from+rise.to-rise.from))
		}
	}
	return len(flat) > 0 && median(flat) >= 3 && median(flat) >= 0.7*median(slope)
}

// rests tells whether the rest is not short beside the rises to it and from it, as a
// stretch of one long rise is.
func rests(driven, freewheel []edge) bool {
	var flat, slope []float64
	for _, o := range restSpans(driven, freewheel) {
		flat = append(flat, float64(o.to-o.from+1))
	}
	for _, edges := range [][]edge{driven, freewheel} {
		for _, e := range risings(edges) {
			slope = append(slope, float64(e.to-e.from))
		}
	}
	return len(flat) > 0 && median(flat) >= 0.7*2*median(slope)
}

// shorter tells whether most occurrences last fewer than n samples.
func shorter(occ []span, n int) bool {
	short := 0
	for _, o := range occ {
		if o.to-o.from+1 < n {
			short++
		}
	}
	return 2*short > len(occ)
}

// follows tells whether nearly every driven pulse is followed by one freewheel pulse and a rest.
func follows(driven, freewheel []edge) bool {
	ups := risings(driven)
	ends := risings(freewheel)
	if len(ups) < 2 || len(ends) < 1 {
		return false
	}
	good, k := 0, 0
	for i := 0; i+1 < len(ups); i++ {
		for k < len(ends) && ends[k].to <= ups[i].to {
			k++
		}
		if k < len(ends) && ends[k].to+2 < ups[i+1].from && (k+1 == len(ends) || ends[k+1].to >= ups[i+1].from) {
			good++
		}
	}
	return good >= min(2, len(ups)-1) && good*10 >= 8*(len(ups)-1)
}

func risings(edges []edge) []edge {
	var out []edge
	for _, e := range edges {
		if e.rising {
			out = append(out, e)
		}
	}
	return out
}

// restSpans lists the stretches from the end of freewheel to the next driven pulse.
func restSpans(driven, freewheel []edge) []span {
	var out []span
	ups := risings(driven)
	k := 0
	for _, e := range risings(freewheel) {
		for k < len(ups) && ups[k].from < e.to {
			k++
		}
		if k == len(ups) {
			break
		}
		out = append(out, span{e.to, ups[k].from})
	}
	return out
}
