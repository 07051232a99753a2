package pulse

import (
	"math"
	"slices"
)

// edge is one transition, in sample indices. Durations are times spent beyond a
// reference level between the states: for a clean transition the instant of
// linear interpolation, for one that dithers across the level the mean of its crossings.
type edge struct {
	rising   bool
	from, to int     // last sample in the state left, first in the state reached
	mid      float64 // 50 % reference level instant
	tenth    float64 // 10 % reference level instant
	ninth    float64 // 90 % reference level instant
	early    int     // samples between the level left and 50 %, 10 % apart from it
	inside   int     // samples strictly between the 10 % and 90 % levels
}

// scanner finds transitions between two state levels. A transition counts only
// when it goes from beyond one state boundary to beyond the other.
type scanner struct {
	codes     []int16
	low, high float64 // state levels, codes
	bound     float64 // state boundaries lie this far inside the levels, codes
	edges     []edge
	runts     int
}

func (s *scanner) scan() {
	s.find()
	s.locate()
}

// find lists the transitions without their instants.
func (s *scanner) find() {
	mid := (s.low + s.high) / 2
	lowBound, highBound := clamp16(math.Floor(s.low+s.bound)), clamp16(math.Ceil(s.high-s.bound))
	below := clamp16(math.Floor(mid)) // the highest code not above the middle
	i := 0
	for i < len(s.codes) && s.codes[i] > lowBound && s.codes[i] < highBound {
		i++
	}
	if i == len(s.codes) {
		return
	}
	state, since := s.codes[i] >= highBound, i
	for {
		start := s.leave(i, below, state)
		if start == len(s.codes) {
			return
		}
		j := start
		for j < len(s.codes) && s.codes[j] > lowBound && s.codes[j] < highBound {
			j++
		}
		if j == len(s.codes) {
			return
		}
		if reached := s.codes[j] >= highBound; reached == state {
			s.runts++
			i = j
			continue
		}
		from := start - 1
		for from > since && s.codes[from] > lowBound && s.codes[from] < highBound {
			from--
		}
		s.edges = append(s.edges, edge{rising: !state, from: from, to: j})
		state, since, i = !state, j, j
	}
}

// leave returns the first index from i on at the other side of the middle.
func (s *scanner) leave(i int, below int16, high bool) int {
	rest := s.codes[i:]
	if high {
		for k, c := range rest {
			if c <= below {
				return i + k
			}
		}
		return len(s.codes)
	}
	for k, c := range rest {
		if c > below {
			return i + k
		}
	}
	return len(s.codes)
}

func clamp16(x float64) int16 { return int16(min(math.MaxInt16, max(math.MinInt16, x))) }

// locate fills in the reference level instants of every edge.
func (s *scanner) locate() {
	for k := range s.edges {
		s.locateOne(&s.edges[k])
	}
}

func (s *scanner) locateOne(e *edge) {
	a := s.high - s.low
	y10, y50, y90 := s.low+0.1*a, s.low+0.5*a, s.low+0.9*a
	e.mid = s.instant(*e, y50)
	wide := s.widened(*e)
	e.tenth, e.ninth = s.instant(wide, y10), s.instant(wide, y90)
	e.inside, e.early = 0, 0
	for _, c := range s.codes[e.from+1 : e.to] {
		y := float64(c)
		if y <= y10 || y >= y90 {
			continue
		}
		e.inside++
		if y < y50 == e.rising {
			e.early++
		}
	}
}

// widened is the transition with a third more at either end: where noise made the state
// boundaries wide, the samples that end it come before the waveform is clear of the
// 10 % and 90 % levels.
func (s *scanner) widened(e edge) edge {
	more := (e.to - e.from) / 3
	if s.bound > 0.025*(s.high-s.low) {
		e.from, e.to = max(0, e.from-more), min(len(s.codes)-1, e.to+more)
	}
	return e
}

// instant returns from + the time the transition spends before the level, with
// straight lines between samples (IEEE Std 181: linear interpolation).
func (s *scanner) instant(e edge, level float64) float64 {
	t := float64(e.from)
	for k := e.from; k < e.to; k++ {
		y0, y1 := float64(s.codes[k]), float64(s.codes[k+1])
		if !e.rising {
			y0, y1 = 2*level-y0, 2*level-y1
		}
		switch {
		case y0 <= level && y1 <= level:
			t++
		case y0 <= level:
			t += (level - y0) / (y1 - y0)
		case y1 <= level:
			t += (level - y1) / (y0 - y1)
		}
	}
	return t
}

// removeNotches joins states interrupted by excursions far shorter than that
// state usually lasts, and tells how many there were.
func (s *scanner) removeNotches() (removed int) {
	var lasts [2][]float64
	for k := 1; k < len(s.edges); k++ {
		state := b2i(s.edges[k-1].rising)
		lasts[state] = append(lasts[state], s.edges[k].mid-s.edges[k-1].mid)
	}
	var shortest [2]float64
	for i, d := range lasts {
		if len(d) == 0 {
			continue
		}
		slices.Sort(d)
		usual := d[len(d)*9/10]
		shortest[i] = 0.12 * usual
		if usual >= 8 {
			shortest[i] = max(shortest[i], min(2.5, usual/3))
		}
	}
	kept := make([]edge, 0, len(s.edges))
	for k := 0; k < len(s.edges); k++ {
		e := s.edges[k]
		if k+1 < len(s.edges) && s.edges[k+1].mid-e.mid < shortest[b2i(e.rising)] {
			k++
			removed++
			continue
		}
		kept = append(kept, e)
	}
	if removed == 0 || unevenness(kept) > unevenness(s.edges) {
		return 0
	}
	s.edges = kept
	return removed
}

// unevenness is the standard deviation of the period relative to its mean; of
// fewer than two periods, one.
func unevenness(edges []edge) float64 {
	var periods []float64
	for k := 0; k+2 < len(edges); k += 2 {
		periods = append(periods, edges[k+2].mid-edges[k].mid)
	}
	if len(periods) < 2 {
		return 1
	}
	return deviation(periods) / mean(periods)
}

func b2i(b bool) int {
	if b {
		return 1
	}
	return 0
}
