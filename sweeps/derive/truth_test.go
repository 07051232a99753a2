package derive_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/derive"
)

// truth is a board at one setpoint, known exactly, and the instruments that look at it.
type truth struct {
	supply, drop, low float64 // V; drop: supply less the driven level of the load
	period, duty      float64
	current           float64 // A, in the load's loop
	board             sweeps.Board
	wiring            instruments.Wiring

	repeats  int
	accuracy instruments.Accuracy // of the average meter
	scatter  float64              // V, of its readings
	noise    float64              // V, of the scope
	rng      *rand.Rand           // nil: no errors at all
	probe    float64              // factor that the scope's volts are wrong by
	ac       bool                 // coupling
	overload bool                 // of the average meter
	edge     float64              // of a transition, as a share of the period
}

const aperture = 0.2 // s

// onTimer is a resistor on the timer's own output, high side: revision A.
func onTimer() *truth {
	t := &truth{supply: 9, drop: 1.4, low: 0.1, period: 2e-3, duty: 0.37, repeats: 5, probe: 1, edge: 1e-2,
		accuracy: instruments.Accuracy{Reading: 35e-6, Range: 5e-6, Resolution: 10e-6}, noise: 20e-3}
	t.board = sweeps.Board{Driver: sweeps.Driver{Stage: sweeps.StageNone}, Load: sweeps.Load{Kind: sweeps.ResistorLoad}}
	t.wiring = instruments.Wiring{
		Meters: []instruments.MeterWiring{{Name: "average", Reads: "average_voltage", Between: instruments.Between{instruments.NodeLoadHigh, instruments.NodeLoadLow}}},
		Scope:  &instruments.ScopeWiring{Channels: []instruments.ScopeChannelWiring{{Number: 1, Between: instruments.Between{instruments.NodeTimerOut, instruments.NodeCommon}, Probe: 10}}},
	}
	return t
}

// switched is a load between the supply and a transistor, the current meter in its loop.
func switched() *truth {
	t := onTimer()
	t.board.Driver.Stage, t.board.Load.Kind = sweeps.StageNMOS, sweeps.Motor
	t.drop, t.low, t.current = 0.05, 0, 0.1
	t.wiring.Meters = append(t.wiring.Meters, instruments.MeterWiring{Name: "motor", Reads: "motor_current", Burden: 0.3})
	t.wiring.Scope.Channels = append(t.wiring.Scope.Channels,
		instruments.ScopeChannelWiring{Number: 2, Between: instruments.Between{instruments.NodeLoadLow, instruments.NodeCommon}, Probe: 10})
	return t
}

func (t *truth) high() float64    { return t.supply - t.drop }
func (t *truth) average() float64 { return t.duty*t.high() + (1-t.duty)*t.low }

// normal is a draw of standard deviation s.
func (t *truth) normal(s float64) float64 {
	if t.rng == nil {
		return 0
	}
	return s * t.rng.NormFloat64()
}

// raw is what the instruments answer: errors of gain and zero drawn once, normal, with the
// standard deviation that their limits stand for (a/√3); scatter anew for each reading.
func (t *truth) raw() derive.Raw {
	raw := derive.Raw{Setpoint: sweeps.Setpoint{Supply: t.supply}, Meters: make([][]instruments.Sample, len(t.wiring.Meters))}
	root := math.Sqrt(3)
	gain, zero := t.normal(t.accuracy.Reading/root), t.normal(t.accuracy.Range*10/root)
	for range t.repeats {
		v := t.average()*(1+gain) + zero + t.normal(t.scatter)
		raw.Meters[0] = append(raw.Meters[0], t.reading(v))
		if len(raw.Meters) > 1 {
			raw.Meters[1] = append(raw.Meters[1], measured(t.current, si.Ampere, 1, instruments.Accuracy{Reading: 1e-3, Range: 1e-4}))
		}
		raw.Supply = append(raw.Supply, instruments.SupplyState{Output: true,
			Voltage: measured(t.supply, si.Volt, 0, instruments.Accuracy{Reading: 5e-4, Offset: 5e-3, Resolution: 1e-3}),
			Current: measured(t.current, si.Ampere, 0, instruments.Accuracy{Reading: 1.5e-3, Offset: 5e-3})})
		raw.Records = append(raw.Records, t.record())
	}
	return raw
}

func (t *truth) reading(v float64) instruments.Sample {
	s := measured(v, si.Volt, 10, t.accuracy)
	s.Aperture = aperture
	if t.overload {
		s.Value, s.Outcome, s.Raw = math.NaN(), instruments.Overload, "9.90000000E+37"
	}
	return s
}

func measured(v float64, u si.Unit, full float64, a instruments.Accuracy) instruments.Sample {
	return instruments.Sample{Value: v, Unit: u, Outcome: instruments.Measured, Raw: fmt.Sprintf("%+.8E", v), Range: full, Accuracy: a}
}

// samples a period: not a whole number, so that the instants fall anywhere between two of them.
const samples = 197.65

// record is one record of all channels: twelve periods from a random phase, eight
// bits over the screen.
func (t *truth) record() []instruments.Waveform {
	if t.wiring.Scope == nil {
		return nil
	}
	phase := 0.3
	if t.rng != nil {
		phase = t.rng.Float64()
	}
	var waves []instruments.Waveform
	for _, c := range t.wiring.Scope.Channels {
		span := 1.3 * t.supply
		w := instruments.Waveform{Channel: c.Number, Interval: t.period / samples, VoltsPerCode: span / 250, VoltsAtZero: 0.55 * t.supply,
			ClipLow: -128, ClipHigh: 127, Triggered: true, FullScale: span, TimeBase: 30e-6, Accuracy: instruments.Accuracy{Reading: 0.02, Range: 0.01}}
		mean := 0.0
		volts := make([]float64, 2400)
		for i := range volts {
			x := math.Mod(float64(i)/samples+phase, 1)
			volts[i] = t.level(x)
			if c.Number == 2 {
				volts[i] = t.supply - volts[i]
			}
			mean += volts[i] / float64(len(volts))
		}
		for _, v := range volts {
			if t.ac {
				v -= mean
			}
			k := math.Round((v*t.probe + t.normal(t.noise) - w.VoltsAtZero) / w.VoltsPerCode)
			w.Codes = append(w.Codes, int16(min(max(k, -128), 127)))
		}
		waves = append(waves, w)
	}
	return waves
}

// level is the load's voltage at a fraction x of the period, the driven phase first, edges centred on their instants.
func (t *truth) level(x float64) float64 {
	edge := t.edge
	rise, fall := math.Min(x, 1-x), math.Abs(x-t.duty)
	switch {
	case rise < edge/2 && x < 0.5:
		return t.low + (t.high()-t.low)*(0.5+x/edge)
	case rise < edge/2:
		return t.low + (t.high()-t.low)*(0.5-(1-x)/edge)
	case fall < edge/2:
		return t.high() - (t.high()-t.low)*(0.5+(x-t.duty)/edge)
	case x < t.duty:
		return t.high()
	}
	return t.low
}

// read derives one quantity.
func (t *truth) read(tb testing.TB, q sweeps.Quantity) sweeps.Reading {
	tb.Helper()
	r := derive.Readings(t.wiring, t.board, t.raw(), []sweeps.Quantity{q})
	if len(r) != 1 || r[0].Quantity != q || r[0].Unit != q.Unit() {
		tb.Fatalf("%s: got %+v", q, r)
	}
	if (r[0].Value == nil) != (r[0].U == nil) {
		tb.Fatalf("%s: a value without uncertainty, or the other way round: %+v", q, r[0])
	}
	return r[0]
}

func flag(r sweeps.Reading, name string) (sweeps.Flag, bool) {
	i := slices.IndexFunc(r.Flags, func(f sweeps.Flag) bool { return f.Name == name })
	if i < 0 {
		return sweeps.Flag{}, false
	}
	return r.Flags[i], true
}
