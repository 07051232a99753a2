package pulse

import (
	"math"
	"slices"
)

// neighbourNoise estimates white noise (standard deviation, codes) from the
// differences of neighbouring samples, transitions left out by their size.
func neighbourNoise(codes []int16) float64 {
	const most = 2048
	stride := max(1, (len(codes)-1)/most)
	diffs := make([]float64, 0, most+1)
	for i := 0; i+1 < len(codes); i += stride {
		diffs = append(diffs, math.Abs(float64(codes[i+1])-float64(codes[i])))
	}
	slices.Sort(diffs)
	limit := max(3, 4*diffs[len(diffs)/2])
	var sum float64
	n := 0
	for _, d := range diffs {
		if d > limit {
			break
		}
		sum += d * d
		n++
	}
	return math.Sqrt(sum / 2 / float64(max(1, n)))
}

// guess is a first idea of the state levels, in codes.
type guess struct {
	low, high float64
	three     []float64 // lowest, middle and highest of three levels; nil: there are not three
	width     int
	noise     float64
}

// guessLevels splits the range in two halves and takes the mode of each (IEEE Std
// 181, histogram method), with bins of whole codes about a hundredth of the range
// wide, or as wide as the noise. It repeats with the split between the modes, so that
// overshoot does not decide what the halves are.
func guessLevels(codes []int16, h histogram) guess {
	g := guess{noise: neighbourNoise(codes)}
	share := 0.0
	if h.n >= 2000 {
		share = 0.0005
	}
	low, high := h.trimmed(share)
	span := float64(high - low)
	g.width = max(1, int(math.Ceil(min(span/8, max(span/100, 2*g.noise)))))
	g.width = (g.width + h.step - 1) / h.step * h.step
	split := low + (high-low)/2
	for range 8 {
		g.low, _ = h.mode(low, split, g.width)
		g.high, _ = h.mode(split+1, high, g.width)
		next := int(math.Floor((g.low + g.high) / 2))
		if next == split {
			break
		}
		split = next
	}
	g.more(codes, h, low, high)
	return g
}

type peak struct {
	at    float64
	count int
}

// more looks for a third level: three peaks of the histogram with valleys between them.
func (g *guess) more(codes []int16, h histogram, low, high int) {
	var peaks []peak
	// Narrower windows than for the modes: levels five times the noise apart must show a valley.
	width := max(h.step, int(math.Ceil(min(float64(g.width), max(1.2*g.noise, float64(high-low)/100)))))
	apart := max(4*g.noise, 3*float64(h.step), 0.02*float64(high-low))
	least := max(3, h.n/250)
	for _, p := range h.peaks(low, high, width, apart) {
		if p.count >= least && stays(codes, p.at, max(float64(width), 2*g.noise+float64(h.step))) {
			peaks = append(peaks, p)
		}
	}
	peaks = peaks[:min(len(peaks), 6)]
	slices.SortFunc(peaks, func(a, b peak) int { return int(math.Copysign(1, a.at-b.at)) })
	peaks = h.separate(peaks, width)
	if len(peaks) < 3 {
		return
	}
	first, last := peaks[0], peaks[len(peaks)-1]
	between := peaks[1 : len(peaks)-1]
	best := slices.MaxFunc(between, func(a, b peak) int { return a.count - b.count })
	g.three = []float64{first.at, best.at, last.at}
}

// stays tells whether samples within reach of a level tend to come in a row, as those of a
// state do and those caught on transitions do not.
func stays(codes []int16, level, reach float64) bool {
	const most = 20000
	from, to := int(math.Floor(level-reach)), int(math.Ceil(level+reach))
	in, next := 0, 0
	stride := 1 + len(codes)/most
	for i := 0; i+1 < len(codes); i += stride {
		if c := int(codes[i]); c < from || c > to {
			continue
		}
		in++
		if c := int(codes[i+1]); c >= from && c <= to {
			next++
		}
	}
	return 2*next >= in && next > 0
}

// peaks lists windows of local maxima of the count, fullest first, at least apart from one another.
func (h histogram) peaks(low, high, width int, apart float64) []peak {
	half := width / 2
	sums := make([]int, high-low+2)
	for c := low; c <= high; c++ {
		sums[c-low+1] = sums[c-low] + int(h.count[c-h.low])
	}
	window := func(c int) int {
		a, b := max(low, c-half), min(high, c-half+width-1)
		return sums[b-low+1] - sums[a-low]
	}
	var all []peak
	for c := low; c <= high; c++ {
		if n := window(c); n > 0 && (c == low || n >= window(c-1)) && (c == high || n >= window(c+1)) {
			all = append(all, peak{float64(c), n})
		}
	}
	slices.SortFunc(all, func(a, b peak) int { return b.count - a.count })
	var out []peak
	for _, p := range all {
		if len(out) == 8 {
			break
		}
		if !slices.ContainsFunc(out, func(o peak) bool { return math.Abs(o.at-p.at) < apart }) {
			out = append(out, p)
		}
	}
	return out
}

// separate merges neighbouring peaks without a clear valley between them, keeping the fuller.
func (h histogram) separate(peaks []peak, width int) []peak {
	var out []peak
	for _, p := range peaks {
		if len(out) == 0 {
			out = append(out, p)
			continue
		}
		prev := &out[len(out)-1]
		valley := math.MaxInt
		for c := int(prev.at); c+width <= int(p.at); c += max(1, width/2) {
			n, _ := h.within(float64(c), float64(c+width-1))
			valley = min(valley, n)
		}
		switch {
		case valley*3 <= min(prev.count, p.count):
			out = append(out, p)
		case p.count > prev.count:
			*prev = p
		}
	}
	return out
}
