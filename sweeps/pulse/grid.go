package pulse

import (
	"math"
	"slices"
)

// jitter is the share of the finest step below which two values differ by their rounding in a computer alone.
const jitter = 1e-3

// grid finds the voltage step of samples that came from a converter: few
// distinct values, all near whole multiples of one step. Samples of many values get a
// step finer than matters. So do those of too few values for the step to show; what it may
// well be then is given as unseen (V): anything, by its logarithm, from 1/4096 of the range up to
// the closest distance or a sixth of the range, whose rms is 0.28 of the largest.
func grid(volts []float64, low, high float64) (step, unseen float64) {
	if high == low {
		return max(math.Abs(high)*1e-6, 1e-9), 0
	}
	fine := (high - low) / finest
	values := distinct(volts, 4096)
	if len(values) < 2 || len(values) > 16 && len(values) > len(volts)/2+2 {
		return fine, 0
	}
	closest := math.Inf(1)
	for i := 1; i < len(values); i++ {
		d := values[i] - values[i-1]
		if d > fine {
			closest = min(closest, d)
		} else if d > jitter*fine {
			return fine, 0 // a grid finer than codes of 16 bits can count over this range: finer than matters
		}
	}
	if math.IsInf(closest, 1) {
		return fine, 0
	}
	step, found := commensurate(values, closest)
	few := len(values) < 6 && step > (high-low)/100
	switch {
	case found && step < fine:
		return fine, 0
	case found && !few:
		return step, 0
	case !found && len(values) > len(volts)/4:
		return fine, 0
	}
	// Of few values the common step may be a multiple of the converter's own.
	return fine, 0.28 * min(closest, (high-low)/6)
}

// commensurate finds the largest step, of the closest distance and its simple fractions, of
// which all values are whole multiples within a fifth (they may be rounded as printed).
func commensurate(values []float64, closest float64) (step float64, found bool) {
	for k := 1.0; k <= 5; k++ {
		step := refined(values, closest/k)
		fits := true
		for _, v := range values {
			x := (v - values[0]) / step
			if math.Abs(x-math.Round(x)) > 0.2/k {
				fits = false
				break
			}
		}
		if fits {
			return step, true
		}
	}
	return 0, false
}

// refined fits a step to distances between neighbouring values, first to those of few
// steps, where a step a little off does not yet miscount them, then to wider ones.
func refined(values []float64, step float64) float64 {
	for reach := 8.0; ; reach *= 8 {
		var sum, steps float64
		all := true
		for i := 1; i < len(values); i++ {
			d := values[i] - values[i-1]
			if d > reach*step {
				all = false
				continue
			}
			sum += d
			steps += math.Round(d / step)
		}
		if steps > 0 {
			step = sum / steps
		}
		if all || reach > finest {
			return step
		}
	}
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
