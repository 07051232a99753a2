package pulse

import "math"

// Levels disagree by this share of the amplitude before the shorth is believed to tell of more than chance.
const shorthApart = 0.03

// shorth is the mean of the shortest half: of all intervals of codes within [from, to] that hold half of
// the samples there, the mean of the samples in the narrowest; among equals in the middle one.
// (Andrews and others, Robust Estimates of Location, 1972; the further method for state
// levels of IEC 60469:2013.)
func (h histogram) shorth(from, to float64) (level float64, ok bool) {
	n, _ := h.within(from, to)
	if n < 4 {
		return 0, false
	}
	a, b := max(0, int(math.Ceil(from))-h.low), min(len(h.count)-1, int(math.Floor(to))-h.low)
	half := (n + 1) / 2
	narrowest, first, last := math.MaxInt, 0, 0
	held, j := 0, a
	for i := a; i <= b; i++ {
		for j <= b && held < half {
			held += int(h.count[j])
			j++
		}
		if held < half {
			break
		}
		if h.count[i] > 0 {
			switch width := j - i; {
			case width < narrowest:
				narrowest, first, last = width, i, i
			case width == narrowest:
				last = i
			}
		}
		held -= int(h.count[i])
	}
	at := (first + last) / 2
	k, sum := h.within(float64(at+h.low), float64(at+narrowest-1+h.low))
	if k == 0 {
		return 0, false
	}
	return sum / float64(k), true
}

// secondLevels compares the levels found with the shorth of each half of the codes, a method
// that knows nothing of transitions, and flags what disagrees.
func (a *analysis) secondLevels() {
	if a.three || a.h.n < 32 {
		return
	}
	low, high := a.low.level, a.high.level
	mid, w := (low+high)/2, high-low
	for _, s := range []struct {
		name     string
		level    float64
		from, to float64
		n        int
	}{{"low", low, math.MinInt16, mid, a.low.n}, {"high", high, mid + 1e-9, math.MaxInt16, a.high.n}} {
		in, _ := a.h.within(s.from, s.to)
		second, ok := a.h.shorth(s.from, s.to)
		// Where transitions and ringing take up half of a state, its shortest half is not the level.
		if !ok || 2*s.n < in || a.h.n > 2*mostSpans*mostSamples {
			continue
		}
		if d := second - s.level; math.Abs(d) > max(shorthApart*w, 1.5*a.q, 5*math.Sqrt(a.noise)) {
			a.flag(LevelsDisagree, "the %s level is %.4g V by the settled part of each state, %.4g V by the shortest half of all samples: the state has more than one level", s.name, a.volts(s.level), a.volts(second))
		}
	}
}
