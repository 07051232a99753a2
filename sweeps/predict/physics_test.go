package predict

import (
	"math"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// Figures that were worked out beforehand, by numerical integration or transient
// simulation, for the project's page of circuit laws; each is checked here as it is stated there.

func times(t *testing.T, b sweeps.Board, s Setting) (high, low float64) {
	t.Helper()
	v := mustAt(t, mustNew(t, b, Options{}), s)
	return v[sweeps.THigh], v[sweeps.TLow]
}

func at5V() Setting { return Setting{Supply: 5, Temperature: Reference} }

var d4148 = sweeps.Diode{Name: "1N4148"}

func between2(t *testing.T, what string, got, low, high float64) {
	t.Helper()
	if !(got >= low && got <= high) {
		t.Errorf("%s: %.4g, stated %g to %g", what, got, low, high)
	}
}

func TestSteeringDiodesAgainstLn2RC(t *testing.T) {
	for _, c := range []struct{ supply, low, high float64 }{{12, 0.095, 0.125}, {9, 0.125, 0.155}, {5, 0.215, 0.275}} { // whole percents
		b := bareBoard(timing(sweeps.Steered, 10e3, 10e3, 100e-9, d4148))
		high, _ := times(t, b, Setting{Supply: c.supply, Temperature: Reference})
		between2(t, "0.693 RC falls short by", 1-math.Ln2*10e3*100e-9/high, c.low, c.high)
	}
}

func TestBypassedIsNotSteered(t *testing.T) {
	steered := timing(sweeps.Steered, 10e3, 1e3, 100e-9, d4148)
	bypassed := timing(sweeps.Bypassed, 10e3, 1e3, 100e-9, d4148)
	bypassed.DischargeDiode = noDiode
	s, _ := times(t, bareBoard(steered), at5V())
	b, _ := times(t, bareBoard(bypassed), at5V())
	between2(t, "t_high of steered over bypassed", math.Abs(s/b-1), 0.11, 0.17)
}

func TestTriggerCurrentSlowsDischarge(t *testing.T) {
	b := bareBoard(timing(sweeps.Steered, 10e3, 100e3, 10e-9, d4148))
	_, without := times(t, b, at5V())
	b.Timer.TriggerCurrent = &si.TolCurrent{Nominal: si.Amperes(0.5e-6)}
	_, with := times(t, b, at5V())
	between2(t, "trigger current on t_low", with/without-1, 0.024, 0.030)
}

func TestDischargeOffsetLengthensLow(t *testing.T) {
	for _, c := range []struct{ supply, low, high float64 }{{5, 0.015, 0.021}, {12, 0.006, 0.008}} {
		s := Setting{Supply: c.supply, Temperature: Reference}
		b := bareBoard(timing(sweeps.Steered, 10e3, 33e3, 10e-9, d4148))
		_, without := times(t, b, s)
		b.Timer.DischargeOffset = &si.TolVoltage{Nominal: si.Volts(0.037)}
		_, with := times(t, b, s)
		between2(t, "offset on t_low", with/without-1, c.low, c.high)
	}
}

// A threshold one percent of the supply higher: t_low keeps, since the trigger moves along; t_high grows 3.3 %.
func TestThresholdErrorMovesHighOnly(t *testing.T) {
	b := bareBoard(timing(sweeps.Plain, 10e3, 10e3, 10e-9, noDiode))
	high, low := times(t, b, at5V())
	b.Timer.Threshold = &si.TolRatio{Nominal: si.Ratios(2.0/3 + 0.01)}
	high2, low2 := times(t, b, at5V())
	near(t, "t_low", low2, low, 1e-9)
	between2(t, "t_high", high2/high-1, 0.021, 0.034)
}

// A comparator delay lengthens its own phase by td and the next by td times the ratio of currents.
func TestDelayOvershoots(t *testing.T) {
	b := bareBoard(timing(sweeps.Steered, 1e3, 100e3, 100e-9, d4148))
	s := Setting{Supply: 9, Temperature: Reference}
	high, low := times(t, b, s)
	b.Timer.Delay = &si.TolTime{Nominal: si.Seconds(0.3e-6)}
	high2, low2 := times(t, b, s)
	between2(t, "t_high grows, us", (high2-high)*1e6, 0.25, 0.6)
	between2(t, "t_low grows, us", (low2-low)*1e6, 8, 18)
}

func TestWarmthShortens(t *testing.T) {
	for _, c := range []struct{ supply, low, high float64 }{{5, -0.021, -0.013}, {12, -0.008, -0.004}} {
		b := bareBoard(timing(sweeps.Steered, 10e3, 10e3, 100e-9, d4148))
		high, _ := times(t, b, Setting{Supply: c.supply, Temperature: Reference})
		warm, _ := times(t, b, Setting{Supply: c.supply, Temperature: Reference + 15})
		between2(t, "15 K on t_high", warm/high-1, c.low, c.high)
	}
}

// At 1 mA silicon loses 2 mV/K; a Schottky's leakage doubles every 10 K.
func TestJunctionsOverTemperature(t *testing.T) {
	volts := func(kelvin float64) float64 {
		d := diode{is: 2.52e-9, n: 1.752, rs: 0.568, eg: 1.11, xti: 3}
		d.warm(kelvin, boltzmann*kelvin/elementary)
		return d.nvt * math.Log1p(1e-3/d.is)
	}
	between2(t, "mV/K", 1e3*(volts(reference+1)-volts(reference)), -2.2, -1.7)
	d := diode{is: 3.17e-5, n: 1.373, eg: 0.69, xti: 2}
	d.warm(reference+10, boltzmann*(reference+10)/elementary)
	between2(t, "leakage over 10 K", d.is/3.17e-5, 1.8, 2.2)
}

// fed is an output-fed board on a bipolar timer that also carries a load.
func fed(r, load float64) sweeps.Board {
	tm := timing(sweeps.OutputFed, r, r, 100e-9, d4148)
	tm.Common = fixedR(100)
	b := bareBoard(tm)
	b.Timer.Part = "bipolar"
	b.Load.Resistance = ohms(load)
	return b
}

// An output-fed bipolar timer at 5 V stretches t_high 5 to 15 times once its output
// carries something, here 17 mA, and stops when it carries more.
func TestOutputFedBipolarAt5V(t *testing.T) {
	for _, r := range []float64{10e3, 47e3, 100e3} {
		high, _ := times(t, fed(r, 220), at5V())
		between2(t, "t_high over ln 2 RC", high/(math.Ln2*r*100e-9), 5, 15)
	}
	m := mustNew(t, fed(10e3, 10), Options{})
	res, err := m.At(at5V())
	if err != nil {
		t.Fatal(err)
	}
	if _, ok := res.Values[sweeps.Duty]; ok || res.Oscillates {
		t.Error("a board that does not oscillate has no duty")
	}
	if len(res.Flags) == 0 || res.Flags[0].Name != NoOscillation {
		t.Errorf("flags %v, want %s first", res.Flags, NoOscillation)
	}
	for q, v := range res.Values {
		if math.IsNaN(v) {
			t.Errorf("%s is not a number", q)
		}
	}
	t.Log(res.Flags)
}

// 30 % duty on 9 V with a flyback diode: the motor's terminals average 7.1 V, not the 2.1 V of two levels.
func TestThreeLevels(t *testing.T) {
	l := load{r: 4, l: 2e-3, k: 6e-3, coulomb: 2.5e-4, viscous: 7.4e-8}
	c := cycle{on: 0.3 * 2e-3, off: 0.7 * 2e-3, r: l.r, l: l.l}
	c.sources[driven], c.sources[free] = source{v: 8.9}, source{v: -0.8}
	emf, w := l.balance(&c)
	between2(t, "average", w.voltage(), 6.6, 7.9)
	between2(t, "back-EMF", emf, 6, 8.5)
}

func TestSupplyBy50mV(t *testing.T) {
	b := bareBoard(timing(sweeps.Steered, 10e3, 10e3, 100e-9, d4148))
	s := at5V()
	high, _ := times(t, b, s)
	s.Supply += 0.05
	moved, _ := times(t, b, s)
	between2(t, "50 mV on t_high", math.Abs(moved/high-1), 0.002, 0.012)
}

// A "better" Schottky with 30 uA of leakage halves the low time at 5 V with 68 k to 100 k.
func TestLeakySchottkyHalvesTheLowTime(t *testing.T) {
	for _, r := range []float64{68e3, 100e3} {
		_, silicon := times(t, bareBoard(timing(sweeps.Steered, 10e3, r, 10e-9, d4148)), at5V())
		_, leaky := times(t, bareBoard(timing(sweeps.Steered, 10e3, r, 10e-9, sweeps.Diode{Name: "1N5819"})), at5V())
		between2(t, "t_low with the Schottky over that with silicon", leaky/silicon, 0.3, 0.65)
	}
}
