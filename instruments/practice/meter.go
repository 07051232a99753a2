package practice

import (
	"context"
	"fmt"
	"math/rand/v2"
	"slices"
	"sync/atomic"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// lineFrequency of the practice bench, Hz: one power line cycle is 20 ms.
const lineFrequency = 50.0

// meterRange is one range: its full scale, and the limits of error as shares of reading and range.
type meterRange struct{ full, reading, ofRange, over float64 }

// The ranges of a 6½-digit meter, one year (figures of the standard-meter dialect: HP 34401A; ohms from memory).
var (
	voltRanges = []meterRange{
		{0.1, 50e-6, 35e-6, 1.2}, {1, 40e-6, 7e-6, 1.2}, {10, 35e-6, 5e-6, 1.2}, {100, 45e-6, 6e-6, 1.2}, {1000, 45e-6, 10e-6, 1},
	}
	ampereRanges = []meterRange{{10e-3, 500e-6, 200e-6, 1.2}, {100e-3, 500e-6, 50e-6, 1.2}, {1, 1000e-6, 100e-6, 1.2}, {3, 1200e-6, 200e-6, 1}}
	ohmRanges    = []meterRange{{100, 100e-6, 40e-6, 1.2}, {1e3, 100e-6, 10e-6, 1.2}, {10e3, 100e-6, 10e-6, 1.2}, {100e3, 100e-6, 10e-6, 1.2}, {1e6, 100e-6, 10e-6, 1.2}}
	cycles       = []float64{0.02, 0.2, 1, 10, 100}
)

// Times of the meter, s.
const (
	meterAnswer = 2e-3  // to understand a message and begin the reply
	rangeTime   = 30e-3 // to settle after a change of range (Keithley 2016 specification: under 30 ms)
)

// meter is a multimeter that keeps to the contract of the standard-meter dialect.
// Its leads are fixed: asked for the other function it measures nothing sensible, and says overload.
type meter struct {
	*scpi.Device
	world *world
	rng   *rand.Rand
	place Meter

	unit      si.Unit
	functions map[si.Unit]*function
	autoZero  bool
	zeroed    float64 // what the last zero took off, as a share of the range
	wander    float64 // −1 … 1 of zeroDrift
	last      string  // reading, for FETCh?
	shunt     float64 // Ω in series beyond the declared burden
	loose     atomic.Bool
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

// functionNames are the functions as FUNC takes and answers them.
var functionNames = []struct {
	unit          si.Unit
	header, short string
}{{si.Volt, "VOLTage[:DC]", "VOLT:DC"}, {si.Ampere, "CURRent[:DC]", "CURR:DC"}, {si.Ohm, "RESistance", "RES"}}

func newMeter(w *world, r *rand.Rand, place Meter) *meter {
	m := &meter{Device: scpi.NewDevice("Nightbench,practice-meter,DM-"+place.Name+",1.0", 20), world: w, rng: r, place: place, functions: map[si.Unit]*function{}}
	for _, f := range []struct {
		unit   si.Unit
		ranges []meterRange
	}{{si.Volt, voltRanges}, {si.Ampere, ampereRanges}, {si.Ohm, ohmRanges}} {
		m.functions[f.unit] = &function{ranges: f.ranges, gain: 2*r.Float64() - 1, zero: 2*r.Float64() - 1}
	}
	m.wander = 2*r.Float64() - 1
	m.Reset = m.reset
	m.reset()
	m.Set("[SENSe:]FUNCtion", m.setFunction, scpi.Text{})
	m.Get("[SENSe:]FUNCtion", func(*scpi.Call) (string, error) { return scpi.FormatString(m.functionName()), nil })
	m.register("VOLTage[:DC]", "V", m.functions[si.Volt])
	m.register("CURRent[:DC]", "A", m.functions[si.Ampere])
	m.register("RESistance", "OHM", m.functions[si.Ohm])
	m.registerZero()
	m.Get("READ", func(c *scpi.Call) (string, error) { return m.read(c.Context) })
	m.Get("FETCh", func(*scpi.Call) (string, error) {
		if m.last == "" {
			return "", scpi.NewFault(scpi.DataStale, "no reading")
		}
		return m.last, nil
	})
	return m
}

func (m *meter) instrument() *Instrument {
	return &Instrument{device: m.Device, again: m.reset, own: map[Kind]func() func(){LeadOff: m.loosen},
		answer: func(ctx context.Context, message []byte) []byte {
			if m.world.clock.Sleep(ctx, seconds(meterAnswer)) != nil {
				return nil
			}
			return m.Execute(ctx, message)
		}}
}

func (m *meter) reset() {
	m.unit, m.autoZero, m.last = si.Volt, true, ""
	for _, f := range m.functions {
		f.in, f.nplc, f.auto = len(f.ranges)-1, 10, true
	}
	m.feel()
}

func (m *meter) register(name, unit string, f *function) {
	most := f.ranges[len(f.ranges)-1].full
	m.Value("[SENSe:]"+name+":RANGe[:UPPer]", scpi.Numeric{Unit: unit, Max: most}, func(*scpi.Call) float64 { return f.ranges[f.in].full },
		func(_ *scpi.Call, v float64) error {
			f.in, f.auto, m.last = f.rangeFor(v), false, ""
			m.feel()
			return nil
		})
	m.Set("[SENSe:]"+name+":RANGe:AUTO", func(c *scpi.Call) error { f.auto = c.Bool(0); return nil }, scpi.Boolean{})
	m.Get("[SENSe:]"+name+":RANGe:AUTO", func(*scpi.Call) (string, error) { return scpi.Bit(f.auto), nil })
	m.Value("[SENSe:]"+name+":NPLCycles", scpi.Numeric{Min: cycles[0], Max: cycles[len(cycles)-1], Default: 10}, func(*scpi.Call) float64 { return f.nplc },
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
	text := c.Text(0)
	for _, f := range functionNames {
		if scpi.MatchHeader(f.header, text) {
			m.unit, m.last = f.unit, ""
			m.feel()
			return nil
		}
	}
	return scpi.NewFault(scpi.IllegalParameter, fmt.Sprintf("FUNC %q", text))
}

func (m *meter) functionName() string {
	for _, f := range functionNames {
		if f.unit == m.unit {
			return f.short
		}
	}
	panic("a function without a name")
}

func (m *meter) function() *function { return m.functions[m.unit] }

// smallShunt is what the 10 mA range has in series beyond the 0.1 Ω of the others, Ω
// (Keithley 2016 specification: 10 Ω and 0.1 Ω).
const smallShunt = 9.9

// feel lets the board feel the meter's shunt, which depends on function and range.
func (m *meter) feel() {
	want := 0.0
	if m.place.Unit == si.Ampere && m.unit == si.Ampere && m.function().in == 0 {
		want = smallShunt
	}
	if m.place.Probe != circuit.Through(circuit.LoadCurrent) || want == m.shunt {
		return
	}
	more := want - m.shunt
	m.shunt = want
	m.world.do(func(s *circuit.Sim) { must(s.Change(func(b *circuit.Board) { b.Load.Burden += more })) })
}

// loosen takes a lead off. A current meter's leads carry the load's current: it is interrupted.
func (m *meter) loosen() (lift func()) {
	carries := m.place.Probe == circuit.Through(circuit.LoadCurrent)
	swing := func(off bool, ohms float64) {
		m.loose.Store(off)
		if carries {
			m.world.do(func(s *circuit.Sim) { must(s.Change(func(b *circuit.Board) { b.Load.Resistance += ohms })) })
		}
	}
	swing(true, broken)
	return func() { swing(false, -broken) }
}

// loads is the resistance the meter puts across its leads, Ω: 10 MΩ unless stated,
// which a timing capacitor feels and a load does not.
func (p Meter) loads(b *circuit.Board) {
	onCapacitor := slices.Contains([]circuit.Probe{circuit.Between(circuit.Capacitor, circuit.Common), circuit.Between(circuit.Common, circuit.Capacitor)}, p.Probe)
	if p.Unit != si.Volt || !onCapacitor {
		return
	}
	r := p.InputResistance
	if r == 0 {
		r = 10e6
	}
	if b.Timing.Leak > 0 {
		r = r * b.Timing.Leak / (r + b.Timing.Leak)
	}
	b.Timing.Leak = r
}
