package pulse

import "math"

// instantModel is what is known of the error of one kind of transition's instants
// before looking at how they scatter. Variances are in s², for one instant.
type instantModel struct {
	n        int     // transitions
	duration float64 // s, mean 10 % to 90 % duration by counting samples between
	slope    float64 // codes per s at the 50 % level
	caught   float64 // samples, the duration as the first half of each transition tells: ringing fools the second
	noise    float64 // variance from amplitude noise
	grid     float64 // variance from the sample interval
	shape    float64 // s, standard uncertainty from the unknown bend between samples, the same for all
}

// modelInstants describes the rising or the falling transitions of a scanner.
func (a *analysis) modelInstants(s *scanner, rising bool) instantModel {
	var m instantModel
	var inside, early, span, skew float64
	for _, e := range s.edges {
		if e.rising != rising {
			continue
		}
		m.n++
		inside += float64(e.inside)
		early += float64(e.early)
		span += math.Abs(e.ninth - e.tenth)
		skew += math.Abs(e.ninth-e.mid) - math.Abs(e.mid-e.tenth)
	}
	if m.n == 0 {
		return instantModel{n: 0, slope: math.Inf(1)}
	}
	tau := inside / float64(m.n) // samples
	m.caught = tau
	if 2*early < 0.7*inside {
		m.caught = 2 * early / float64(m.n)
	}
	if tau >= 3 {
		tau = span / float64(m.n)
		m.caught = tau
	}
	m.duration = tau * a.cell
	m.slope = a.slope(s, rising, tau) / a.cell
	sigma := math.Sqrt(max(a.noise, a.q*a.q/12*b2f(tau > 1)))
	m.noise = crossingVariance(sigma/(m.slope*a.cell)) * a.cell * a.cell
	// Ripple lifts each transition as a whole: half of it at the 50 % level.
	m.noise += a.high.slow() / 4 / sq(m.slope)
	m.sampled(a.cell, float64(m.n))
	m.shape = shapeError(tau, math.Abs(skew)/max(span, 1e-9)) * a.cell
	return m
}

// sampled sets the variance from the sample interval, given how many transitions at
// independent places between samples the count of samples caught stands for: a few
// lucky catches must not promise much.
func (m *instantModel) sampled(cell, independent float64) {
	tau := m.caught
	if tau < 3 {
		tau *= independent / (independent + 0.5)
	}
	m.grid = sq(gridError(tau) * cell)
}

// seen replaces the variance from the sample interval by what the instants show once
// enough of them, at different places between samples, have been seen.
func (m *instantModel) seen(variance, most, keep float64) {
	m.grid = min(most, max(0.15*m.grid, 1.15*(variance-m.noise)/(1-keep)))
}

// widest is how far apart sampling alone can put instants that are evenly spaced: a
// sample, and less for transitions that samples fall on.
func (m *instantModel) widest(cell float64) float64 {
	return 1.05 * min(cell, 2*math.Sqrt(12*m.grid))
}

// shaken takes the instants' whole scatter for their error: they jitter.
func (m *instantModel) shaken(variance float64) { m.grid = max(m.grid, variance-m.noise) }

func sq(x float64) float64 { return x * x }

func b2f(b bool) float64 {
	if b {
		return 1
	}
	return 0
}

// slope returns the mean steepness at the 50 % level, codes per sample, over about
// a quarter of the transition.
func (a *analysis) slope(s *scanner, rising bool, tau float64) float64 {
	reach := int(tau / 8)
	var sum float64
	n := 0
	for _, e := range s.edges {
		if e.rising != rising {
			continue
		}
		k := int(e.mid)
		from, to := max(0, k-reach), min(len(a.codes)-1, k+1+reach)
		sum += math.Abs(float64(a.codes[to])-float64(a.codes[from])) / float64(to-from)
		n++
	}
	least := 0.4 * (s.high - s.low) / max(1, tau)
	return max(least, sum/float64(max(1, n)))
}

// crossingVariance is the variance (samples²) of an interpolated instant when noise
// divided by slope is x samples: two independent samples weighted (1−a) and a, 2/3 x² over all
// a; for a slow transition the sum of crossings, ∫Φ(1−Φ) = 1/√π of x.
func crossingVariance(x float64) float64 {
	return min(2*x*x/3, x/math.Sqrt(math.Pi))
}

// gridError is the rms error, in samples, of linear interpolation across a
// transition of tau samples (10 % to 90 %): 1/√12 for one faster than a sample,
// shrinking as samples begin to fall inside. Fitted to simulated straight,
// exponential and Gaussian transitions at random phase.
func gridError(tau float64) float64 {
	return 1 / math.Sqrt(12) / (1 + math.Pow(tau/0.42, 1.6))
}

// shapeError is the standard uncertainty, in samples, of the mean instant from the bend
// of the transition between samples: an exponential one is interpolated late by up to
// 0.084 samples, a symmetric one not at all (simulated). From three samples on the skew tells:
// (t90 − t50) less (t50 − t10) as a share of t90 − t10 is 0.465 for an exponential.
func shapeError(tau, skew float64) float64 {
	bias := min(0.09*tau, 0.084, 0.18/max(tau, 1e-9))
	if tau < 3 {
		return 0.65 * bias
	}
	return bias * min(0.7, max(0.1, skew/0.465*0.7))
}

// bendBetween is what shapeError leaves of a duration between two kinds of transition:
// those of like length and kind bend alike and do not shift it, but a transistor need not
// end a state as a diode does.
func bendBetween(a, b instantModel) float64 {
	return max(math.Abs(a.shape-b.shape), 0.4*math.Hypot(a.shape, b.shape))
}

// coherence tells how far the sampling errors of n instants that follow each other at
// period (in samples) fail to average out: 1 when every instant falls at the same
// place between two samples, 1/n when their places are as good as random. It is the power
// of the phases' mean over the harmonics of the sawtooth error; u is the
// uncertainty of the period and jitter the scatter of an instant, both in samples.
func coherence(period float64, n int, u, jitter float64) float64 {
	const harmonics, most = 6, 400
	if n > most {
		k := coherence(period, most, u, jitter)
		if k < 0.02 { // they are already as good as random
			k *= most / float64(n)
		}
		return k
	}
	period = math.Mod(period, 1)
	var power, norm float64
	for m := 1.0; m <= harmonics; m++ {
		damp := math.Exp(-sq(2 * math.Pi * m * jitter))
		sum := float64(n)
		for lag := 1; lag < n; lag++ {
			x := 2 * math.Pi * m * float64(lag)
			blur := math.Exp(-sq(x*u) / 2)
			if blur < 1e-6 {
				break
			}
			sum += 2 * float64(n-lag) * math.Cos(x*period) * blur * damp
		}
		power += max(0, sum) / float64(n*n) / (m * m)
		norm += 1 / (m * m)
	}
	return min(1, max(0.1/float64(n), power/norm))
}
