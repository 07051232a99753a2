package predict

import (
	"math"
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// A board that cannot work is refused in words that name the nodes and numbers concerned.
func TestBoardsThatCannotWork(t *testing.T) {
	for _, c := range []struct {
		name  string
		spoil func(b *sweeps.Board)
		words []string
	}{
		{"negative capacitor", func(b *sweeps.Board) { b.Timing.Capacitor = si.Exactly(si.Farads(-1e-7)) }, []string{"capacitor", "negative"}},
		{"no capacitor", func(b *sweeps.Board) { b.Timing.Capacitor = si.TolCapacitance{} }, []string{"timing.capacitor", "node X"}},
		{"no discharge resistor", func(b *sweeps.Board) { b.Timing.Discharge = sweeps.Resistor{} }, []string{"timing.discharge", "X"}},
		{"no charge resistor", func(b *sweeps.Board) { b.Timing.Charge = sweeps.Resistor{} }, []string{"timing.charge", "Q", "S"}},
		{"steered without diode", func(b *sweeps.Board) { b.Timing.ChargeDiode = noDiode }, []string{"charge_diode", "Q and X"}},
		{"plain with diodes", func(b *sweeps.Board) { b.Timing.Network = sweeps.Plain }, []string{"plain"}},
		{"bypassed with two", func(b *sweeps.Board) { b.Timing.Network = sweeps.Bypassed }, []string{"bypassed"}},
		{"wiper without pot", func(b *sweeps.Board) { b.Timing.Network = sweeps.Wiper }, []string{"timing.pot"}},
		{"wiper on an unknown pot", func(b *sweeps.Board) {
			b.Timing.Network, b.Timing.Discharge, b.Timing.Track = sweeps.Wiper, sweeps.Resistor{}, sweeps.Resistor{Pot: true}
		}, []string{"bench file", "timing.pot"}},
		{"output tied to capacitor", func(b *sweeps.Board) {
			b.Timing.Network, b.Timing.Charge, b.Timing.Discharge = sweeps.OutputFed, sweeps.Resistor{}, sweeps.Resistor{}
		}, []string{"X", "O", "timing.common"}},
		{"unknown network", func(b *sweeps.Board) { b.Timing.Network = "twisted" }, []string{"twisted", "output-fed"}},
		{"gate never turns on", func(b *sweeps.Board) { b.Driver.Part = sweeps.Transistor{RdsOn: 0.1, VgsTh: 12} }, []string{"never turns on", "12 V", "11.4 V", "O"}},
		{"transistor of another kind", func(b *sweeps.Board) { b.Driver.Part.Name = "2N2222" }, []string{"2N2222", "npn", "nmos"}},
		{"base without resistor", func(b *sweeps.Board) {
			b.Driver.Stage, b.Driver.Part.Name = sweeps.StageNPN, "2N2222"
		}, []string{"base_resistor", "O"}},
		{"unknown timer", func(b *sweeps.Board) { b.Timer.Part = "triode" }, []string{"triode", "bipolar", "cmos", "ideal"}},
		{"unknown diode", func(b *sweeps.Board) { b.Driver.Flyback.Name = "1N0000" }, []string{"flyback", "1N0000", "1N4148"}},
		{"no load", func(b *sweeps.Board) { b.Load.Resistance = si.TolResistance{} }, []string{"load.resistance"}},
		{"motor without constant", func(b *sweeps.Board) { b.Load.TorqueConstant = si.TolTorqueConstant{} }, []string{"torque_constant"}},
		{"resistor with constant", func(b *sweeps.Board) { b.Load.Kind = sweeps.ResistorLoad }, []string{"torque_constant", "resistor"}},
		{"load.to behind a transistor", func(b *sweeps.Board) { b.Load.ToSupply = true }, []string{"load.to"}},
		{"static below coulomb", func(b *sweeps.Board) { b.Load.StaticTorque.UnmarshalText([]byte("0.1 mN m")) }, []string{"static_torque", "coulomb_torque"}},
		{"threshold above the supply", func(b *sweeps.Board) { b.Timer.Threshold = &si.TolRatio{Nominal: si.Ratios(1.2)} }, []string{"threshold", "1.2"}},
		{"falling drop", func(b *sweeps.Board) {
			b.Timer.Drop = []sweeps.CurrentVoltage{{Voltage: si.Volts(1)}, {Current: si.Amperes(0.1), Voltage: si.Volts(0.5)}}
		}, []string{"drop", "row 2", "falls"}},
	} {
		b := pump()
		c.spoil(&b)
		_, err := New(b, Options{})
		if err == nil {
			t.Errorf("%s: accepted", c.name)
			continue
		}
		for _, w := range append(c.words, b.Name) {
			if !strings.Contains(strings.ReplaceAll(err.Error(), "\u00a0", " "), w) {
				t.Errorf("%s: %q does not say %q", c.name, err, w)
			}
		}
	}
}

func TestSettingsThatCannotBe(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	for _, s := range []Setting{
		{Supply: 0, Pot: 1e3}, {Supply: -9, Pot: 1e3}, {Supply: math.NaN(), Pot: 1e3}, {Supply: 9, Pot: -1}, {Supply: 9, Pot: math.NaN()},
		{Supply: 9, Pot: 1e3, Burden: -1}, {Supply: 9, Pot: 1e3, Temperature: 400},
	} {
		if _, err := m.At(s); err == nil {
			t.Errorf("%+v accepted", s)
		}
		if p, flags := m.Draw(2, 1).At(s); len(p) != 0 || len(flags) != 1 {
			t.Errorf("%+v: %d predictions, flags %v", s, len(p), flags)
		}
	}
	tm := timing(sweeps.Wiper, 1e3, 0, 1e-8, d4148)
	tm.Discharge, tm.Track = sweeps.Resistor{}, fixedR(100e3)
	if _, err := mustNew(t, bareBoard(tm), Options{}).At(Setting{Supply: 9, Pot: 1.2}); err == nil || !strings.Contains(err.Error(), "between 0 and 1") {
		t.Errorf("pot position 1.2: %v", err)
	}
}

// At 0.95 a pot of 100 k charges through 95 k: the share lies in the charging path.
func TestWiperShareIsTheChargingShare(t *testing.T) {
	tm := timing(sweeps.Wiper, 1e3, 0, 1e-8, d4148)
	tm.Discharge, tm.Track = sweeps.Resistor{}, fixedR(100e3)
	m := mustNew(t, bareBoard(tm), Options{})
	v := mustAt(t, m, Setting{Supply: 12, Pot: 0.95, Temperature: Reference})
	between2(t, "t_high over ln 2·96 k·C", v[sweeps.THigh]/(math.Ln2*96e3*1e-8), 1, 1.2)
	between2(t, "duty", v[sweeps.Duty], 0.93, 0.96)
}

// Every catalogue part says where its figures come from, and works on a board.
func TestCatalogueIsSourced(t *testing.T) {
	c, err := ReadCatalogue(nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range c.Diodes {
		for key, f := range map[string]Figure{"is": d.Is, "n": d.N, "rs": d.Rs, "max_current": d.MaxCurrent} {
			if f.Source == "" {
				t.Errorf("diode %s: %s has no source", d.Name, key)
			}
		}
		b := pump()
		b.Timing.ChargeDiode.Name, b.Driver.Flyback.Name = d.Name, d.Name
		mustAt(t, mustNew(t, b, Options{}), at9V(10e3))
	}
	for _, q := range c.Transistors {
		if q.MaxCurrent.Source == "" || q.MaxPower.Source == "" {
			t.Errorf("transistor %s: ratings have no source", q.Name)
		}
		b := pump()
		b.Driver.Stage, b.Driver.Part.Name = sweeps.Stage(q.Kind), q.Name
		r := ohms(1e3)
		b.Driver.BaseResistor = &r
		mustAt(t, mustNew(t, b, Options{}), at9V(10e3))
	}
	for _, x := range c.Timers {
		if x.Threshold.Source == "" {
			t.Errorf("timer %s: threshold has no source", x.Name)
		}
		b := pump()
		b.Timer.Part = x.Name
		mustAt(t, mustNew(t, b, Options{}), at9V(10e3))
	}
	if len(c.Motors) < 3 {
		t.Errorf("only %d motors", len(c.Motors))
	}
}

// Forward voltages of the cards at 1 and 10 mA, as computed for the data-sheet
// notes at 27 degC, and the 2N2222's saturation: 0.02 to 0.15 V below 100 mA.
func TestPartsAgainstTheirSheets(t *testing.T) {
	c, err := ReadCatalogue(nil)
	if err != nil {
		t.Fatal(err)
	}
	vt := boltzmann * reference / elementary
	for name, want := range map[string][2]float64{"1N4148": {0.585, 0.694}, "1N5819": {0.124, 0.205}, "BAT54": {0.225, 0.309}} {
		p, err := find("diode", name, c.Diodes, func(p DiodePart) string { return p.Name })
		if err != nil {
			t.Fatal(err)
		}
		d := diode{is: p.Is.Typical, n: p.N.Typical, rs: p.Rs.Typical, nvt: p.N.Typical * vt}
		for i, current := range []float64{1e-3, 10e-3} {
			s := d.freewheel(current)
			if got := -(s.v - s.r*current); math.Abs(got-want[i]) > 0.0015 {
				t.Errorf("%s at %g A: %.4f V, want %.3f", name, current, got, want[i])
			}
		}
	}
	q := transistor{satR: 0.5, betaF: 220, betaR: 1, vt: vt}
	for _, i := range []float64{1e-3, 10e-3, 50e-3, 99e-3} {
		v, _ := q.saturation(i, i/10)
		between2(t, "saturation", v, 0.02, 0.15)
	}
}
