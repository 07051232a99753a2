package predict

import (
	"math"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

func near(t *testing.T, what string, got, want, relative float64) {
	t.Helper()
	if !(math.Abs(got-want) <= relative*math.Abs(want)) {
		t.Errorf("%s is %.9g, want %.9g within %g", what, got, want, relative)
	}
}

func timing(network sweeps.Network, charge, discharge, c float64, diode sweeps.Diode) sweeps.Timing {
	return sweeps.Timing{
		Network: network, Charge: fixedR(charge), Discharge: fixedR(discharge),
		Capacitor: si.Exactly(si.Farads(c)), ChargeDiode: diode, DischargeDiode: diode,
	}
}

var noDiode = sweeps.Diode{None: true}

// t = ln 2·R·C per phase: the definition of the ideal timer.
func TestIdealTimerIsLn2RC(t *testing.T) {
	for _, c := range []struct{ ra, rb, c, supply float64 }{
		{10e3, 10e3, 100e-9, 5}, {1e3, 100e3, 1e-9, 15}, {1e6, 220, 1e-5, 4.5}, {4.7e3, 33e3, 47e-9, 9},
	} {
		v := mustAt(t, mustNew(t, bareBoard(timing(sweeps.Plain, c.ra, c.rb, c.c, noDiode)), Options{}), Setting{Supply: c.supply, Temperature: Reference})
		near(t, "t_high", v[sweeps.THigh], math.Ln2*(c.ra+c.rb)*c.c, 1e-9)
		near(t, "t_low", v[sweeps.TLow], math.Ln2*c.rb*c.c, 1e-9)
		near(t, "frequency", v[sweeps.Frequency], 1/(math.Ln2*(c.ra+2*c.rb)*c.c), 1e-9)
	}
}

// The worked example of TI SLFS022, section 8.3.2 (figure: RA 5 k, RB 3 k, C 0.15 uF):
// 0.8316 ms high and 0.31185 ms low with the rounded constant 0.693.
func TestDatasheetExample(t *testing.T) {
	v := mustAt(t, mustNew(t, bareBoard(timing(sweeps.Plain, 5e3, 3e3, 0.15e-6, noDiode)), Options{}), Setting{Supply: 5, Temperature: Reference})
	near(t, "t_high", v[sweeps.THigh], 0.8316e-3, 5e-4)
	near(t, "t_low", v[sweeps.TLow], 0.31185e-3, 5e-4)
	near(t, "high fraction", v[sweeps.Duty], 8.0/11, 5e-4)
}

// The bipolar output tables' typical points: TI SLFS022, electrical characteristics.
func TestBipolarOutputTables(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	for _, c := range []struct{ supply, current, high float64 }{{5, 0.1, 3.3}, {15, 0.1, 13.3}, {15, 0.2, 12.5}} {
		o := output{c.supply, m.drop, m.low, 1, 1, 0, false, 0}
		v, _ := o.high(c.current)
		near(t, "high level", v, c.high, 1e-9)
	}
	for _, c := range []struct{ supply, current, low float64 }{{5, 5e-3, 0.1}, {5, 8e-3, 0.15}, {15, 10e-3, 0.1}, {15, 50e-3, 0.4}, {15, 100e-3, 2}, {15, 200e-3, 2.5}} {
		o := output{c.supply, m.drop, m.low, 1, 1, 0, false, 0}
		v, _ := o.sink(c.current)
		near(t, "low level", v, c.low, 1e-9)
	}
}

// pump is a dosing-pump driver: steered network with the pot discharging, MOSFET, motor.
func pump() sweeps.Board {
	d := sweeps.Diode{Name: "1N4148"}
	b := sweeps.Board{
		Name: "Dosing pump driver", RatedSupply: [2]si.Voltage{si.Volts(4.5), si.Volts(12)},
		Timer: sweeps.Timer{Part: "bipolar"},
		Timing: sweeps.Timing{
			Network: sweeps.Steered, Charge: sweeps.Resistor{Value: within(ohms(10e3), 0.01)}, Discharge: sweeps.Resistor{Pot: true},
			Stop: within(ohms(470), 0.01), Capacitor: within(si.Exactly(si.Farads(100e-9)), 0.05), ChargeDiode: d, DischargeDiode: d,
		},
		Driver: sweeps.Driver{Stage: sweeps.StageNMOS, Part: sweeps.Transistor{Name: "logic-level-50m"}, Flyback: sweeps.Diode{Name: "1N5819"}},
		Load:   sweeps.Load{Kind: sweeps.Motor, Resistance: within(ohms(12), 0.1), Inductance: within(si.Exactly(si.Henries(5e-3)), 0.2)},
	}
	set := func(into interface{ UnmarshalText([]byte) error }, text string) {
		if err := into.UnmarshalText([]byte(text)); err != nil {
			panic(err)
		}
	}
	set(&b.Load.TorqueConstant, "8 mV s/rad")
	set(&b.Load.StaticTorque, "0.6 mN m")
	set(&b.Load.CoulombTorque, "0.4 mN m")
	set(&b.Load.ViscousTorque, "0.2 uN m s")
	set(&b.Load.Inertia, "5 g cm2")
	return b
}

func within[T interface {
	Spread() (float64, float64, bool)
}](t T, tolerance float64) T {
	switch x := any(&t).(type) {
	case *si.TolResistance:
		x.Tolerance = tolerance
	case *si.TolCapacitance:
		x.Tolerance = tolerance
	case *si.TolInductance:
		x.Tolerance = tolerance
	}
	return t
}

// Common practice, no source: a bipolar timer on 9 V with 10 k charging reads about
// 0.8 V on average with 100 k discharging, 4.3 to 4.4 V with 10 k, and about 8.3 V near
// full duty. The drop used is the catalogue's, 0.6 V without load; nothing is tuned to meet these.
func TestCommonPracticeReadings(t *testing.T) {
	for _, c := range []struct{ discharge, volts, within float64 }{{100e3, 0.8, 0.15}, {10e3, 4.35, 0.5}, {220, 8.3, 0.5}} {
		b := bareBoard(timing(sweeps.Steered, 10e3, c.discharge, 100e-9, sweeps.Diode{Name: "1N4148"}))
		b.Timer.Part = "bipolar"
		b.Load.Resistance = ohms(10e6) // a meter
		v := mustAt(t, mustNew(t, b, Options{}), Setting{Supply: 9, Temperature: Reference})
		t.Logf("%g ohm: %.3f V, drop %.3f V, duty %.4f", c.discharge, v[sweeps.AverageVoltage], v[sweeps.OutputDrop], v[sweeps.Duty])
		if got := v[sweeps.AverageVoltage]; math.Abs(got-c.volts) > c.within {
			t.Errorf("%g ohm discharging: %.2f V, practice has %.2f within %.2f", c.discharge, got, c.volts, c.within)
		}
	}
}

func TestPumpPredictsEveryQuantity(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	v := mustAt(t, m, Setting{Supply: 9, Pot: 10e3, Temperature: Reference})
	for _, q := range Quantities() {
		if x, ok := v[q]; !ok || math.IsNaN(x) {
			t.Errorf("%s has no value", q)
		}
	}
	near(t, "period", v[sweeps.Period], v[sweeps.THigh]+v[sweeps.TLow], 1e-12)
	near(t, "power", v[sweeps.SupplyPower], 9*v[sweeps.SupplyCurrent], 1e-12)
	near(t, "torque", 8e-3*v[sweeps.MotorCurrent], 0.4e-3+0.2e-6*v[sweeps.Speed], 1e-6)
	p, flags := m.Draw(1000, 1).At(Setting{Supply: 9, Pot: 10e3, Temperature: Reference})
	for _, q := range Quantities() {
		t.Logf("%-16s %12.6g  %12.6g … %12.6g %s", q, p[q].Value, p[q].Low, p[q].High, p[q].Unit)
		if p[q].Low > p[q].Value || p[q].High < p[q].Value {
			t.Errorf("%s: %g lies outside its band %g to %g", q, p[q].Value, p[q].Low, p[q].High)
		}
	}
	t.Log(flags)
}
