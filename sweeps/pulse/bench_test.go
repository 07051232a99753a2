package pulse

import (
	"math/rand/v2"
	"testing"
	"time"
)

// long is a 12-bit record of n samples, a thousand to a period, with noise.
func long(n int) Record {
	rng := rand.New(rand.NewPCG(7, 7))
	var s specimen
	s.low, s.high, s.period, s.duty, s.start = 0.1, 8.7, 1e-3, 0.3, 2e-4
	s.up, s.down = ramp(5e-6), ramp(5e-6)
	s.bits, s.bottom, s.span, s.noise = 12, -2, 13, 0.05
	s.n, s.interval = n, 1.00013e-6
	return s.capture(rng)
}

func sumCodes(codes []int16) (sum int64) {
	for _, c := range codes {
		sum += int64(c)
	}
	return sum
}

// BenchmarkMillion reports how many times longer the analysis of a million samples takes
// than summing them, both measured in this run.
func BenchmarkMillion(b *testing.B) {
	r := long(1_000_000)
	var sum, analyse time.Duration
	var total int64
	b.ReportAllocs()
	for b.Loop() {
		t0 := time.Now()
		total += sumCodes(r.Codes)
		t1 := time.Now()
		if _, err := Analyse(r, Options{}); err != nil {
			b.Fatal(err)
		}
		sum += t1.Sub(t0)
		analyse += time.Since(t1)
	}
	if total == 0 {
		b.Fatal("nothing summed")
	}
	b.ReportMetric(float64(analyse)/float64(sum), "x-sum")
}

// TestNoAllocationPerSample holds the memory used to what the edges, the range of codes and the result need.
func TestNoAllocationPerSample(t *testing.T) {
	r := long(200_000)
	small := r
	small.Codes = r.Codes[:20_000]
	few := testing.AllocsPerRun(2, func() { analyseOrPanic(small) })
	many := testing.AllocsPerRun(2, func() { analyseOrPanic(r) })
	if many > few+200 {
		t.Errorf("%v allocations for 20,000 samples, %v for 200,000", few, many)
	}
}

func analyseOrPanic(r Record) {
	if _, err := Analyse(r, Options{}); err != nil {
		panic(err)
	}
}
