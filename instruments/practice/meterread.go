package practice

import (
	"context"
	"math"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// Noise and drift of the meter.
const (
	meterNoise = 0.5e-6 // rms of a reading as a share of the range at 1 PLC; it falls with the root of the aperture
	zeroDrift  = 20e-6  // of the range, where the zero ends up once warm (common practice, no source)
	zeroTau    = 1800.0 // s, of the meter's warm-up (common practice, no source)
	pickUp     = 1e-3   // V rms on a lead that hangs in the air, at 1 PLC (common practice, no source)
)

// overload is the reply beyond a range: the standard's infinity.
const overload = 9.9e37

func (m *meter) registerZero() {
	m.Set("[SENSe:]ZERO:AUTO", func(c *scpi.Call) error {
		if m.autoZero = c.Word(0) == "ON"; c.Word(0) == "ONCE" {
			m.zeroed = m.drifted()
		}
		return nil
	}, scpi.Choice{Words: []string{"ON", "OFF", "ONCE"}})
	m.Get("[SENSe:]ZERO:AUTO", func(*scpi.Call) (string, error) { return scpi.Bit(m.autoZero), nil })
}

// drifted is where the zero has wandered since power-on, as a share of the range.
func (m *meter) drifted() float64 {
	return -m.wander * zeroDrift * math.Expm1(-m.world.now()/zeroTau)
}

// read takes a new reading. With auto-range it looks again whenever the range has to change.
func (m *meter) read(ctx context.Context) (string, error) {
	f := m.function()
	for {
		mean, err := m.integrate(ctx, f.nplc/lineFrequency)
		if err != nil {
			return "", err
		}
		next := f.fit(mean)
		if next == f.in || m.unit != m.place.Unit {
			m.last = scpi.NR3(m.shown(mean, f))
			return m.last, nil
		}
		f.in = next
		m.feel()
		if err := m.world.clock.Sleep(ctx, seconds(rangeTime)); err != nil {
			return "", err
		}
	}
}

// integrate averages the running wave over the aperture, then the zero for as long again (auto-zero).
func (m *meter) integrate(ctx context.Context, aperture float64) (*circuit.Mean, error) {
	mean, err := m.world.mean(ctx, m.place.Probe, aperture)
	if err != nil {
		return nil, err
	}
	if m.autoZero {
		m.zeroed = m.drifted()
		err = m.world.clock.Sleep(ctx, seconds(aperture))
	}
	return mean, err
}

// fit is the range that auto-range goes to: up where the peaks are beyond this one, down where they fit a lower.
func (f *function) fit(mean *circuit.Mean) int {
	peak := peakOf(mean)
	if r := f.ranges[f.in]; !f.auto || peak <= r.over*r.full && f.rangeFor(peak) >= f.in {
		return f.in
	}
	return f.rangeFor(peak)
}

func peakOf(mean *circuit.Mean) float64 { return math.Max(math.Abs(mean.Min), math.Abs(mean.Max)) }

// shown is what the display says.
func (m *meter) shown(mean *circuit.Mean, f *function) float64 {
	switch {
	case m.unit == si.Ohm:
		return m.ohms(f)
	case m.unit != m.place.Unit:
		return overload
	case m.loose.Load() && m.unit == si.Volt:
		return f.steps(m.rng.NormFloat64() * pickUp / math.Sqrt(f.nplc))
	}
	x := mean.Value()
	if r := m.place.Series; r > 0 && m.unit == si.Volt { // a divider with the meter's own input
		x *= m.input() / (m.input() + r)
	}
	return m.measured(x, peakOf(mean), f)
}

// measured gives a value the meter's own errors, noise and steps, and says overload
// where it is beyond the range or the peaks drive the front end out of it.
func (m *meter) measured(x, peak float64, f *function) float64 {
	r := f.ranges[f.in]
	if math.Abs(x) > r.over*r.full || peak > 2*r.full {
		return math.Copysign(overload, x)
	}
	x += f.gain*r.reading*x + f.zero*r.ofRange*r.full
	x += (m.drifted() - m.zeroed) * r.full
	x += m.rng.NormFloat64() * meterNoise * r.full / math.Sqrt(f.nplc)
	return f.steps(x)
}

// input is the meter's resistance between its leads, Ω.
func (m *meter) input() float64 {
	if m.place.InputResistance > 0 {
		return m.place.InputResistance
	}
	return 10e6
}

// leadOhms is the resistance of a pair of test leads (common practice, no source).
const leadOhms = 0.1

// ohms measures the winding between the load's terminals, the board without power.
// Anywhere else, or with a voltage there, there is nothing sensible to read.
func (m *meter) ohms(f *function) float64 {
	x, alive := 0.0, false
	m.world.do(func(s *circuit.Sim) {
		x = s.Winding() + leadOhms
		alive = math.Abs(s.Look(m.place.Probe)) > 1e-3
	})
	across := m.place.Probe == circuit.Between(circuit.LoadHi, circuit.LoadLo)
	if m.loose.Load() || alive || !across {
		return overload
	}
	if f.auto {
		f.in = f.rangeFor(x)
	}
	return m.measured(x, x, f)
}

// steps rounds to the display.
func (f *function) steps(x float64) float64 {
	return quantise(x, f.ranges[f.in].full*stepShare(f.nplc))
}

// stepShare is the display's step as a share of the range.
func stepShare(nplc float64) float64 {
	switch {
	case nplc >= 100:
		return 0.3e-6
	case nplc >= 10:
		return 1e-6
	case nplc >= 1:
		return 3e-6
	case nplc >= 0.2:
		return 10e-6
	}
	return 100e-6
}
