package pulse

import (
	"math"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"
)

// Whatever comes in, nothing that is not finite comes out, and no value without an uncertainty.
func TestNothingUnusableComesOut(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		seed := rapid.Uint64().Draw(t, "seed")
		rng := rand.New(rand.NewPCG(seed, 1))
		n := rapid.IntRange(3, 400).Draw(t, "samples")
		reach := rapid.SampledFrom([]int{1, 2, 5, 200, 32767}).Draw(t, "reach")
		kind := rapid.IntRange(0, 4).Draw(t, "kind")
		r := Record{PerCode: rapid.SampledFrom([]float64{0.1, -0.1, 1e-12}).Draw(t, "scale"), Interval: 1e-6}
		r.Codes = oddity(rng, kind, n, reach)
		if rapid.Bool().Draw(t, "stamped") {
			x := 0.0
			for range n {
				r.Times = append(r.Times, x)
				x += 1e-6 * float64(rng.IntN(3))
			}
			r.Times[n-1] = x + 1e-6
		}
		res, err := Analyse(r, Options{Expected: 9})
		if err != nil {
			t.Fatal(err)
		}
		for _, q := range res.Quantities {
			if err := q.Check(); err != nil {
				t.Fatalf("%s: %v", q.Name, err)
			}
			if q.U() <= 0 {
				t.Fatalf("%s has no uncertainty; %s %v", q.Name, res.Class, res.Flags)
			}
		}
	})
}

// oddity makes n codes within about ±reach: noise, a walk, two-sample pulses, single spikes, an undersampled sine.
func oddity(rng *rand.Rand, kind, n, reach int) []int16 {
	codes := make([]int16, n)
	walk := 0
	for i := range codes {
		c := 0
		switch kind {
		case 0:
			c = rng.IntN(2*reach+1) - reach
		case 1:
			walk += rng.IntN(3) - 1
			c = walk * reach / 10
		case 2:
			c = reach * (i / 2 % 2)
		case 3:
			c = reach * b2i(rng.IntN(9) == 0)
		case 4:
			c = int(float64(reach) * math.Sin(float64(i)))
		}
		codes[i] = int16(max(math.MinInt16, min(math.MaxInt16, c)))
	}
	return codes
}
