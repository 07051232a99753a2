package pulse

import (
	"math"
	"slices"
)

// grid finds the voltage step of samples that came from a converter: few
// distinct values, all near whole multiples of one step. Otherwise it returns a
// step finer than matters.
func grid(volts []float64, low, high float64) float64 {
	if high == low {
		return max(math.Abs(high)*1e-6, 1e-9)
	}
	fine := (high - low) / finest
	values := distinct(volts, 4096)
	if len(values) < 2 || len(values) > len(volts)/2+2 {
		return fine
	}
	step := math.Inf(1)
	for i := 1; i < len(values); i++ {
		if d := values[i] - values[i-1]; d > fine {
			step = min(step, d)
		}
	}
	if math.IsInf(step, 1) {
		return fine
	}
	// The whole range fixes the step better than its smallest instance does.
	step = (high - low) / math.Round((high-low)/step)
	for _, v := range values {
		x := (v - low) / step
		if math.Abs(x-math.Round(x)) > 0.2 {
			return fine
		}
	}
	return step
}

// distinct returns the sorted distinct values, or nil when there are more than limit.
func distinct(volts []float64, limit int) []float64 {
	seen := make(map[float64]struct{}, 256)
	for _, v := range volts {
		seen[v] = struct{}{}
		if len(seen) > limit {
			return nil
		}
	}
	values := make([]float64, 0, len(seen))
	for v := range seen {
		values = append(values, v)
	}
	slices.Sort(values)
	return values
}
