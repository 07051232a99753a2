package pulse

import (
	"math"
	"math/rand/v2"
)

// synth is a waveform whose parameters are exactly known: a rectangular drive whose
// transitions each take a known course.
type synth struct {
	low, high float64 // V
	period    float64 // s
	duty      float64
	start     float64 // s, first rising transition of the drive
	up, down  response
	jitter    float64 // s, standard deviation of each transition
	sag       float64 // share of the amplitude lost at the end of the high state
	freewheel float64 // V; three levels when conduct > duty: driven, freewheel, low as rest
	conduct   float64
	rippled   float64 // V, peak to peak of a sine on the high state
	ripple    float64 // s, its period
}

// response is how a transition gets from 0 to 1: with the time it takes to reach one
// half, and its mean delay ∫(1 − h) dt, both in s; settled after memory s.
type response struct {
	h                  func(t float64) float64
	memory, half, area float64
	duration           float64 // 10 % to 90 %, s; 0: not stated
}

func step() response {
	return response{h: func(t float64) float64 {
		if t < 0 {
			return 0
		}
		return 1
	}}
}

// ramp, exponential and gaussian transitions of the 10 % to 90 % duration d, s.
func ramp(d float64) response {
	w := d / 0.8
	return response{func(t float64) float64 { return min(1, max(0, t/w)) }, w, w / 2, w / 2, d}
}

func exponential(d float64) response {
	tau := d / math.Log(9)
	return response{func(t float64) float64 {
		if t < 0 {
			return 0
		}
		return 1 - math.Exp(-t/tau)
	}, 16 * tau, tau * math.Ln2, tau, d}
}

func gaussian(d float64) response {
	s := d / 2.5631
	return response{func(t float64) float64 { return 0.5 * math.Erfc(-(t-4*s)/s/math.Sqrt2) }, 9 * s, 4 * s, 4 * s, d}
}

// ringing overshoots by about exp(−half period/decay) and rings with the given period, s.
func ringing(period, decay float64) response {
	w := 2 * math.Pi / period
	h := func(t float64) float64 {
		if t < 0 {
			return 0
		}
		return 1 - math.Exp(-t/decay)*math.Cos(w*t)
	}
	low, high := 0.0, period/4
	for range 60 {
		if mid := (low + high) / 2; h(mid) < 0.5 {
			low = mid
		} else {
			high = mid
		}
	}
	return response{h: h, memory: 20 * decay, half: low, area: 1 / decay / (1/decay/decay + w*w)}
}

// square is ∫(1 − h)² dt, s, and peak the most h exceeds 1, both by fine steps.
func (r response) square() (s float64) {
	const n = 2000
	for i := range n {
		x := 1 - r.h((float64(i)+0.5)/n*r.memory)
		s += x * x * r.memory / n
	}
	return s
}

func (r response) peak() (top float64) {
	const n = 4000
	for i := range n {
		top = max(top, r.h(float64(i)/n*r.memory)-1)
	}
	return top
}

// rms is the root of the mean square over a period of two levels, every transition ending
// before the next begins: ∫h² = t − 2∫(1 − h) + ∫(1 − h)² after a rise, ∫(1 − h)² after a fall.
func (s *synth) rms() float64 {
	a := s.high - s.low
	square := s.duty + (s.up.square()+s.down.square()-2*s.up.area)/s.period
	return math.Sqrt(s.low*s.low + 2*s.low*(s.mean()-s.low) + a*a*square)
}

// wave evaluates the waveform at rising times; jitter moves each transition for good.
func (s *synth) wave(times []float64, rng *rand.Rand) []float64 {
	memory := max(s.up.memory, s.down.memory)
	first := int(math.Floor((times[0]-s.start-memory)/s.period)) - 1
	last := int(math.Ceil((times[len(times)-1]-s.start)/s.period)) + 1
	type change struct{ at, height float64 }
	var changes []change
	shake := func() float64 {
		if s.jitter == 0 {
			return 0
		}
		return s.jitter * rng.NormFloat64()
	}
	for k := first; k <= last; k++ {
		t := s.start + float64(k)*s.period
		changes = append(changes, change{t + shake(), s.high - s.low})
		if s.conduct > s.duty {
			changes = append(changes, change{t + s.duty*s.period + shake(), s.freewheel - s.high},
				change{t + s.conduct*s.period + shake(), s.low - s.freewheel})
			continue
		}
		changes = append(changes, change{t + s.duty*s.period + shake(), s.low - s.high})
	}
	y := make([]float64, len(times))
	settled, done := s.low, 0
	for i, t := range times {
		for done < len(changes) && t-changes[done].at > memory {
			settled += changes[done].height
			done++
		}
		v := settled
		for k := done; k < len(changes) && changes[k].at <= t; k++ {
			h := s.down.h
			if changes[k].height > 0 {
				h = s.up.h
			}
			v += changes[k].height * h(t-changes[k].at)
		}
		y[i] = v - s.sagAt(t)
		if s.rippled > 0 {
			y[i] += (v - s.low) / (s.high - s.low) * s.rippled / 2 * math.Sin(2*math.Pi*t/s.ripple)
		}
	}
	return y
}

func (s *synth) sagAt(t float64) float64 {
	if s.sag == 0 {
		return 0
	}
	x := math.Mod(t-s.start, s.period) / s.period
	if x < 0 {
		x++
	}
	if x >= s.duty {
		return 0
	}
	return s.sag * (s.high - s.low) * x / s.duty
}

// mean is the mean over a period, s.share the duty at the 50 % instants.
func (s *synth) mean() float64 {
	d := (s.down.area - s.up.area) / s.period
	if s.conduct > s.duty {
		rest := s.duty*s.high + (s.conduct-s.duty)*s.freewheel + (1-s.conduct)*s.low
		return rest + ((s.high-s.freewheel)*s.down.area-(s.high-s.freewheel)*s.up.area)/s.period
	}
	return s.low + (s.duty+d)*(s.high-s.low) - s.sag*(s.high-s.low)*s.duty/2
}

func (s *synth) share() float64 { return s.duty + (s.down.half-s.up.half)/s.period }

// converter digitises volts: bits over a range, with noise, gain and offset errors.
type converter struct {
	bits         int
	bottom, span float64 // V
	noise        float64 // V
	gain, offset float64 // actual errors: relative, V
}

func (c converter) perCode() float64 { return c.span / float64(int(1)<<c.bits) }

func (c converter) digitise(volts []float64, rng *rand.Rand) []int16 {
	codes := make([]int16, len(volts))
	most := float64(int(1)<<c.bits) - 1
	for i, v := range volts {
		v = v*(1+c.gain) + c.offset
		if c.noise > 0 {
			v += c.noise * rng.NormFloat64()
		}
		x := math.Round((v - c.bottom) / c.perCode())
		codes[i] = int16(min(most, max(0, x)))
	}
	return codes
}

func (c converter) record(codes []int16, start, interval float64) Record {
	low, high := int16(0), int16(int(1)<<c.bits-1)
	return Record{Codes: codes, Zero: c.bottom, PerCode: c.perCode(), Start: start, Interval: interval, ClipLow: &low, ClipHigh: &high}
}

func grid0(n int, start, interval float64) []float64 {
	t := make([]float64, n)
	for i := range t {
		t[i] = start + float64(i)*interval
	}
	return t
}

// specimen is one generated case: waveform, converter, sampling.
type specimen struct {
	synth
	converter
	n        int
	interval float64
	shape    string
	ring     float64 // s, period of ringing; 0: none
}

func uniform(rng *rand.Rand, a, b float64) float64 { return a + (b-a)*rng.Float64() }

func logUniform(rng *rand.Rand, a, b float64) float64 { return a * math.Pow(b/a, rng.Float64()) }

// draw makes a case of a pulse train: duty 1 to 99 %, 4 to 12 bits, 2 to 60 whole
// periods, from three samples in the shorter phase, noise to 2 % of the swing.
func draw(rng *rand.Rand, most int) specimen {
	var s specimen
	s.duty = uniform(rng, 0.01, 0.99)
	s.period = logUniform(rng, 1e-5, 1e-1)
	short := min(s.duty, 1-s.duty)
	perPeriod := logUniform(rng, 3.2/short, max(8/short, 600))
	s.interval = s.period / perPeriod
	periods := logUniform(rng, 3.05, 60)
	s.n = max(8, min(most, int(periods*perPeriod)))
	s.n = max(s.n, int(3.05*perPeriod)+1)
	s.start = uniform(rng, 0, 1) * s.period
	s.low = uniform(rng, -0.5, 0.5)
	s.high = s.low + uniform(rng, 3, 12)
	s.shapeOf(rng, short*s.period)
	swing := s.high - s.low
	s.bits = 4 + rng.IntN(9)
	s.span = swing / uniform(rng, 0.4, 0.8)
	if s.shape == "ringing" {
		s.span = swing / uniform(rng, 0.3, 0.4)
	}
	s.bottom = s.low - uniform(rng, 0.42, 0.58)*(s.span-swing)
	if rng.IntN(4) > 0 {
		s.noise = uniform(rng, 0, 0.02) * swing
	}
	return s
}

// shapeOf chooses how the transitions look, within the shorter phase (s).
func (s *specimen) shapeOf(rng *rand.Rand, short float64) {
	d := logUniform(rng, 0.01, 0.2) * short
	e := d
	if rng.IntN(2) == 0 {
		e = logUniform(rng, 0.01, 0.2) * short
	}
	switch rng.IntN(6) {
	case 0:
		s.shape, s.up, s.down = "step", step(), step()
	case 1:
		s.shape, s.up, s.down = "ramp", ramp(d), ramp(e)
	case 2:
		s.shape, s.up, s.down = "exponential", exponential(d), exponential(e)
	case 3:
		s.shape, s.up, s.down = "gaussian", gaussian(d), gaussian(e)
	case 4:
		p := logUniform(rng, 0.02, 0.15) * short
		decay := p * uniform(rng, 0.3, 0.8)
		s.shape, s.up, s.down = "ringing", ringing(p, decay), ringing(p, decay)
		s.ring = p
	case 5:
		s.shape, s.up, s.down = "mixed", exponential(d), step()
	}
}

func (s *specimen) capture(rng *rand.Rand) Record {
	codes := s.digitise(s.wave(grid0(s.n, 0, s.interval), rng), rng)
	return s.record(codes, 0, s.interval)
}

func (s *specimen) truth() map[string]float64 {
	t := map[string]float64{
		"duty": s.share(), "period": s.period, "frequency": 1 / s.period, "t_high": s.share() * s.period, "t_low": (1 - s.share()) * s.period,
		"jitter": s.jitter * math.Sqrt2, "ripple": s.rippled, "average_voltage": s.mean(), "high_level": s.high, "low_level": s.low, "amplitude": s.high - s.low,
	}
	if s.conduct <= s.duty && s.sag == 0 {
		t["rms"], t["overshoot"], t["undershoot"] = s.rms(), s.up.peak(), s.down.peak()
	}
	if s.conduct > s.duty {
		t["low_level"], t["back_emf"], t["amplitude"] = s.freewheel, s.low, s.high-s.freewheel
		t["conduction"] = s.conduct // it ends, as it begins, with a rise
	}
	if s.up.duration > 0 {
		t["rise_time"] = s.up.duration
	}
	if s.down.duration > 0 && s.conduct <= s.duty {
		t["fall_time"] = s.down.duration
	}
	return t
}
