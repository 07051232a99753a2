package pulse

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func TestShorthByHand(t *testing.T) {
	// Sorted 1 4 10 11 12 40: half is three samples, the narrowest three are 10 11 12.
	h := newHistogram([]int16{40, 10, 1, 12, 4, 11})
	if x, ok := h.shorth(0, 100); !ok || x != 11 {
		t.Errorf("%g, %v", x, ok)
	}
	if _, ok := h.shorth(0, 10); ok {
		t.Error("three samples have no shortest half worth the name")
	}
}

// Against the definition: sort, slide over half of the samples, take the narrowest.
func TestShorthAgainstDefinition(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 4))
	for range 300 {
		n := 4 + rng.IntN(200)
		codes := make([]int16, n)
		for i := range codes {
			codes[i] = int16(200*rng.NormFloat64() + 300*float64(rng.IntN(2)))
		}
		x, _ := newHistogram(codes).shorth(math.MinInt16, math.MaxInt16)
		slices.Sort(codes)
		half, narrowest := (n+1)/2, math.MaxInt
		for i := 0; i+half <= n; i++ {
			narrowest = min(narrowest, int(codes[i+half-1])-int(codes[i]))
		}
		fits := false
		for i := 0; i+half <= n; i++ {
			fits = fits || int(codes[i+half-1])-int(codes[i]) == narrowest && x >= float64(codes[i]) && x <= float64(codes[i+half-1])
		}
		if !fits {
			t.Fatalf("%g lies in no narrowest half of %v", x, codes)
		}
	}
}

// Where the settled parts say 8.2 V and most samples say 9 V, the high state has no one level.
func TestLevelsDisagree(t *testing.T) {
	rec := timerCapture()
	tr, err := newTrace(rec)
	if err != nil {
		t.Fatal(err)
	}
	a := &analysis{trace: tr}
	a.run()
	if a.result.Flagged(LevelsDisagree) {
		t.Errorf("a plain pulse train is flagged: %v", a.result.Flags)
	}
	a.high.level -= 0.7 / rec.PerCode
	a.secondLevels()
	a.attach()
	if !a.result.Flagged(LevelsDisagree) || len(quantity(t, a.result, "high_level").Flags) == 0 {
		t.Errorf("flags %v", a.result.Flags)
	}
}

func timerCapture() Record {
	s := timer()
	return s.capture(rng())
}
