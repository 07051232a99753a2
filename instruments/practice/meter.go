package practice

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// lineFrequency of the practice bench, Hz: one power line cycle is 20 ms.
const lineFrequency = 50.0

// meterRange is one range: its full scale, and the limits of error as shares of reading and range.
type meterRange struct{ full, reading, ofRange, over float64 }

// The ranges of a 6½-digit meter, one year (figures of the standard-meter dialect: HP 34401A).
var (
	voltRanges = []meterRange{
		{0.1, 50e-6, 35e-6, 1.2}, {1, 40e-6, 7e-6, 1.2}, {10, 35e-6, 5e-6, 1.2}, {100, 45e-6, 6e-6, 1.2}, {1000, 45e-6, 10e-6, 1},
	}
	ampereRanges = []meterRange{{10e-3, 500e-6, 200e-6, 1.2}, {100e-3, 500e-6, 50e-6, 1.2}, {1, 1000e-6, 100e-6, 1.2}, {3, 1200e-6, 200e-6, 1}}
	cycles       = []float64{0.02, 0.2, 1, 10, 100}
)

// meterNoise is the rms noise of a reading as a share of the range at 1 PLC; it falls with the root of the aperture.
const meterNoise = 0.5e-6

// meterAnswer is the time to understand a message and begin the reply, s.
const meterAnswer = 2e-3

// meter is a multimeter that keeps to the contract of the standard-meter dialect.
// Its leads are fixed: asked for the other function it measures nothing sensible, and says overload.
type meter struct {
	*scpi.Device
	world *world
	rng   *rand.Rand
	place Meter

	unit           si.Unit
	volts, amperes function
}

// function is one function's settings, and its errors as shares of the stated limits.
type function struct {
	ranges []meterRange
	in     int // index of the range
	nplc   float64
	auto   bool
	gain   float64 // −1 … 1 of the limit
	zero   float64
}

func newMeter(w *world, r *rand.Rand, place Meter) *meter {
	m := &meter{Device: scpi.NewDevice("Nightbench,practice-meter,DM-"+place.Name+",1.0", 20), world: w, rng: r, place: place}
	m.volts = function{ranges: voltRanges, gain: 2*r.Float64() - 1, zero: 2*r.Float64() - 1}
	m.amperes = function{ranges: ampereRanges, gain: 2*r.Float64() - 1, zero: 2*r.Float64() - 1}
	m.Reset = m.reset
	m.reset()
	m.Set("[SENSe:]FUNCtion", m.setFunction, scpi.Text{})
	m.Get("[SENSe:]FUNCtion", func(*scpi.Call) (string, error) { return scpi.FormatString(m.functionName()), nil })
	m.register("VOLTage", "V", &m.volts)
	m.register("CURRent", "A", &m.amperes)
	m.Get("READ", func(c *scpi.Call) (string, error) { return m.read(c.Context) })
	return m
}

func (m *meter) instrument() *Instrument {
	return &Instrument{answer: func(ctx context.Context, message []byte) []byte {
		if m.world.clock.Sleep(ctx, seconds(meterAnswer)) != nil {
			return nil
		}
		return m.Execute(ctx, message)
	}}
}

func (m *meter) reset() {
	m.unit = si.Volt
	for _, f := range []*function{&m.volts, &m.amperes} {
		f.in, f.nplc, f.auto = len(f.ranges)-1, 10, true
	}
}

func (m *meter) register(name, unit string, f *function) {
	most := f.ranges[len(f.ranges)-1].full
	m.Value("[SENSe:]"+name+"[:DC]:RANGe[:UPPer]", scpi.Numeric{Unit: unit, Max: most}, func(*scpi.Call) float64 { return f.ranges[f.in].full },
		func(_ *scpi.Call, v float64) error { f.in, f.auto = f.rangeFor(v), false; return nil })
	m.Set("[SENSe:]"+name+"[:DC]:RANGe:AUTO", func(c *scpi.Call) error { f.auto = c.Bool(0); return nil }, scpi.Boolean{})
	m.Get("[SENSe:]"+name+"[:DC]:RANGe:AUTO", func(*scpi.Call) (string, error) { return scpi.Bit(f.auto), nil })
	m.Value("[SENSe:]"+name+"[:DC]:NPLCycles", scpi.Numeric{Min: cycles[0], Max: cycles[len(cycles)-1], Default: 10}, func(*scpi.Call) float64 { return f.nplc },
		func(_ *scpi.Call, v float64) error { f.nplc = nextUp(cycles, v); return nil })
}

// rangeFor is the index of the least range that holds v.
func (f *function) rangeFor(v float64) int {
	for i, r := range f.ranges {
		if v <= r.full*(1+1e-9) {
			return i
		}
	}
	return len(f.ranges) - 1
}

// nextUp is the least of the values not below v.
func nextUp(values []float64, v float64) float64 {
	for _, x := range values {
		if v <= x*(1+1e-9) {
			return x
		}
	}
	return values[len(values)-1]
}

func (m *meter) setFunction(c *scpi.Call) error {
	switch text := c.Text(0); {
	case scpi.MatchHeader("VOLTage[:DC]", text):
		m.unit = si.Volt
	case scpi.MatchHeader("CURRent[:DC]", text):
		m.unit = si.Ampere
	default:
		return scpi.NewFault(scpi.IllegalParameter, fmt.Sprintf("FUNC %q", text))
	}
	return nil
}

func (m *meter) functionName() string {
	if m.unit == si.Ampere {
		return "CURR:DC"
	}
	return "VOLT:DC"
}

func (m *meter) function() *function {
	if m.unit == si.Ampere {
		return &m.amperes
	}
	return &m.volts
}

// read integrates the running wave over the aperture, then the zero for as long again (auto-zero).
func (m *meter) read(ctx context.Context) (string, error) {
	f := m.function()
	aperture := f.nplc / lineFrequency
	mean, err := m.world.mean(ctx, m.place.Probe, aperture)
	if err != nil {
		return "", err
	}
	if err := m.world.clock.Sleep(ctx, seconds(aperture)); err != nil {
		return "", err
	}
	if m.unit != m.place.Unit {
		return scpi.NR3(9.9e37), nil
	}
	if f.auto {
		f.in = f.rangeFor(math.Max(math.Abs(mean.Min), math.Abs(mean.Max)))
	}
	return scpi.NR3(m.shown(mean, f)), nil
}

// shown is what the display says: errors of its own, noise, steps, and overload
// where the mean is beyond the range or the peaks drive the front end out of it.
func (m *meter) shown(mean *circuit.Mean, f *function) float64 {
	r := f.ranges[f.in]
	x := mean.Value()
	if math.Abs(x) > r.over*r.full || math.Max(math.Abs(mean.Min), math.Abs(mean.Max)) > 2*r.full {
		return math.Copysign(9.9e37, x)
	}
	x += f.gain*r.reading*x + f.zero*r.ofRange*r.full
	x += m.rng.NormFloat64() * meterNoise * r.full / math.Sqrt(f.nplc)
	return quantise(x, r.full*stepShare(f.nplc))
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
