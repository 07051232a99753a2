package pulse

import (
	"math"
	"math/bits"
	"slices"
	"sync"
)

// histogram counts samples by converter code. Bins are single codes, so no bin
// stays empty only because the bins and the converter's steps do not match.
type histogram struct {
	low   int // code of the first bin
	count []uint32
	step  int // codes between values that occur: 16 when 12 bits come left-aligned in 16
	n     int
}

// counters count codes, all possible ones; index 0 is the lowest int16.
type counters [1 << 16]uint32

// scratch keeps counters between records; they are all zero while they wait.
var scratch = sync.Pool{New: func() any { return new([2]counters) }}

func newHistogram(codes []int16) histogram {
	// Two interleaved counts: a run of equal codes need not wait for itself.
	both := scratch.Get().(*[2]counters)
	defer scratch.Put(both)
	a, b := &both[0], &both[1]
	pairs := codes
	for len(pairs) >= 2 {
		a[uint16(pairs[0])^0x8000]++
		b[uint16(pairs[1])^0x8000]++
		pairs = pairs[2:]
	}
	if len(pairs) == 1 {
		a[uint16(pairs[0])^0x8000]++
	}
	low, high := 0, len(a)-1
	for a[low] == 0 && b[low] == 0 {
		low++
	}
	for a[high] == 0 && b[high] == 0 {
		high--
	}
	h := histogram{low: low + math.MinInt16, count: make([]uint32, high-low+1), n: len(codes)}
	for i := range h.count {
		h.count[i] = a[low+i] + b[low+i]
	}
	clear(a[low : high+1])
	clear(b[low : high+1])
	h.step = h.spacing()
	return h
}

func (h histogram) high() int { return h.low + len(h.count) - 1 }

// spacing finds left-aligned codes (12 bits in 16, say): all a multiple of a power of two,
// or one less, as inverted codes are. Few codes that happen to be even prove
// nothing, so small powers need many codes.
func (h histogram) spacing() int {
	all, allNext, distinct := 0, 0, 0
	for i, c := range h.count {
		if c > 0 {
			all |= h.low + i
			allNext |= h.low + i + 1
			distinct++
		}
	}
	zeros := max(bits.TrailingZeros16(uint16(all)), bits.TrailingZeros16(uint16(allNext)))
	if zeros == 16 || distinct < 2 || zeros < 4 && distinct < 12 || len(h.count) < 4<<zeros {
		return 1
	}
	return 1 << zeros
}

// within counts the samples with codes in [from, to] and returns their sum too.
func (h histogram) within(from, to float64) (n int, sum float64) {
	a := max(0, int(math.Ceil(from))-h.low)
	b := min(len(h.count)-1, int(math.Floor(to))-h.low)
	for i := a; i <= b; i++ {
		c := int(h.count[i])
		n += c
		sum += float64(c) * float64(i+h.low)
	}
	return n, sum
}

// trimmed is the range of codes with the share given left off at each end, so
// that a rare spike does not set the range.
func (h histogram) trimmed(share float64) (low, high int) {
	off := uint64(share * float64(h.n))
	var sum uint64
	for i, c := range h.count {
		if sum += uint64(c); sum > off {
			low = h.low + i
			break
		}
	}
	sum = 0
	for i, c := range slices.Backward(h.count) {
		if sum += uint64(c); sum > off {
			high = h.low + i
			break
		}
	}
	return low, high
}

// mode returns the mean code, and the count, of the fullest window of the given
// width (codes) within [from, to]; among equals the middle one.
func (h histogram) mode(from, to, width int) (level float64, count int) {
	a, b := max(0, from-h.low), min(len(h.count)-1, to-h.low)
	if b < a {
		return float64(from), 0
	}
	width = min(width, b-a+1)
	sum := 0
	for i := a; i < a+width; i++ {
		sum += int(h.count[i])
	}
	best, first, last := sum, a, a
	for i := a + 1; i+width-1 <= b; i++ {
		sum += int(h.count[i+width-1]) - int(h.count[i-1])
		switch {
		case sum > best:
			best, first, last = sum, i, i
		case sum == best && i == last+1:
			last = i
		}
	}
	at := (first + last) / 2
	n, s := h.within(float64(at+h.low), float64(at+h.low+width-1))
	if n == 0 {
		return float64(at+h.low) + float64(width-1)/2, best
	}
	return s / float64(n), best
}
