package predict

import (
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// The output held high is how a technician measures its drop: the meter reads it
// directly. TI SLFS022: 1.7 V at 100 mA, on both supplies.
func TestStaticDrop(t *testing.T) {
	for _, supply := range []float64{5, 15} {
		b := bareBoard(timing(sweeps.Plain, 10e3, 10e3, 10e-9, noDiode))
		b.Timer.Part = "bipolar"
		b.Load.Resistance = ohms((supply - 1.7) / 0.1)
		r, err := mustNew(t, b, Options{}).At(Setting{Supply: supply, Temperature: Reference, Output: HeldHigh})
		if err != nil {
			t.Fatal(err)
		}
		near(t, "drop", r.Values[sweeps.OutputDrop], 1.7, 1e-6)
		near(t, "current", r.Values[sweeps.OutputCurrent], 0.1, 1e-6)
		near(t, "high level", r.Values[sweeps.HighLevel], supply-1.7, 1e-6)
		for _, q := range []sweeps.Quantity{sweeps.Duty, sweeps.Frequency, sweeps.LowLevel} {
			if _, ok := r.Values[q]; ok {
				t.Errorf("an output held high has no %s", q)
			}
		}
		if r.Oscillates || len(r.Flags) > 0 {
			t.Errorf("oscillates %v, flags %v", r.Oscillates, r.Flags)
		}
	}
}

func TestHeldLowDrawsNoLoad(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	r, err := m.At(Setting{Supply: 9, Pot: 10e3, Temperature: Reference, Output: HeldLow})
	if err != nil {
		t.Fatal(err)
	}
	if r.Values[sweeps.MotorCurrent] != 0 || r.Values[sweeps.AverageVoltage] != 0 {
		t.Errorf("motor %g A, %g V", r.Values[sweeps.MotorCurrent], r.Values[sweeps.AverageVoltage])
	}
	if _, err := m.At(Setting{Supply: 9, Output: "wobbling"}); err == nil || !strings.Contains(err.Error(), "wobbling") {
		t.Errorf("a wobbling output: %v", err)
	}
}

// A load that its driver cannot carry at any rated supply is refused with the numbers.
func TestLoadBelowItsDriversMeans(t *testing.T) {
	b := pump()
	b.Load = sweeps.Load{Kind: sweeps.ResistorLoad, Resistance: ohms(1)}
	if _, err := New(b, Options{}); err == nil || !strings.Contains(err.Error(), "may carry") {
		t.Errorf("1 ohm on the MOSFET: %v", err)
	}
	rb := si.Exactly(si.Ohms(100e3))
	b.Driver = sweeps.Driver{Stage: sweeps.StageNPN, Part: sweeps.Transistor{Name: "2N2222"}, BaseResistor: &rb, Flyback: noDiode}
	b.Load.Resistance = ohms(20)
	if _, err := New(b, Options{}); err == nil || !strings.Contains(err.Error(), "base_resistor") {
		t.Errorf("20 ohm on a starved transistor: %v", err)
	}
	b.Driver = sweeps.Driver{Stage: sweeps.StageNone, Flyback: noDiode}
	b.Load.Resistance = ohms(5)
	if _, err := New(b, Options{}); err == nil || !strings.Contains(err.Error(), "output O") {
		t.Errorf("5 ohm on the timer: %v", err)
	}
}

// A winding on the output that also feeds the timing network is flagged, and the band is wide.
func TestSharedOutputIsFlagged(t *testing.T) {
	b := fed(10e3, 60)
	b.Load.Inductance = si.Exactly(si.Henries(1e-3))
	s := Setting{Supply: 12, Temperature: Reference}
	p, flags := mustNew(t, b, Options{}).Draw(50, 1).At(s)
	if !strings.Contains(flagNames(flags), SharedOutput) {
		t.Errorf("flags %v, want %s", flags, SharedOutput)
	}
	if f := p[sweeps.Frequency]; f.High < 1.1*f.Value || f.Low > 0.9*f.Value {
		t.Errorf("frequency %g to %g about %g is too sure", f.Low, f.High, f.Value)
	}
	if p[sweeps.SupplyVoltage].Low != 12 {
		t.Errorf("the supply is set, its band %v", p[sweeps.SupplyVoltage])
	}
}
