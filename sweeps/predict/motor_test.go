package predict

import (
	"math"
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

func flagNames(fs []sweeps.Flag) string {
	var names []string
	for _, f := range fs {
		names = append(names, f.Name)
	}
	return strings.Join(names, " ")
}

// At full duty a motor is its textbook self: E = V − R·I, K·I = friction.
func TestMotorAtFullDuty(t *testing.T) {
	l := load{r: 12, l: 5e-3, k: 8e-3, coulomb: 4e-4, viscous: 2e-7, quad: 1e-10, brush: 0.3}
	c := cycle{on: 1, r: l.r, l: l.l, brush: l.brush}
	c.sources[driven] = source{v: 9}
	emf, w := l.balance(&c)
	near(t, "back-EMF", emf, 9-0.3-12*w.current(), 1e-6)
	near(t, "torque", l.k*w.current(), l.friction(emf/l.k), 1e-6)
	near(t, "voltage", w.voltage(), 9, 1e-9)
}

// Stage none with an ideal timer drives both ways: the mean of two levels is right
// there, and current flows all the time, backwards too.
func TestPushPullBrakes(t *testing.T) {
	b := pump()
	b.Timer.Part = "ideal"
	b.Driver = sweeps.Driver{Stage: sweeps.StageNone, Flyback: noDiode}
	v := mustAt(t, mustNew(t, b, Options{}), at9V(20e3))
	near(t, "average", v[sweeps.AverageVoltage], 9*v[sweeps.Duty], 1e-9)
	near(t, "conduction", v[sweeps.Conduction], 1, 1e-9)
}

// A load to the supply is driven while the output is low.
func TestLoadToTheSupply(t *testing.T) {
	b := bareBoard(timing(sweeps.Plain, 10e3, 10e3, 10e-9, noDiode))
	b.Load.Resistance = ohms(1e3)
	toGround := mustAt(t, mustNew(t, b, Options{}), at9V(0))
	b.Load.ToSupply = true
	toSupply := mustAt(t, mustNew(t, b, Options{}), at9V(0))
	near(t, "averages add to the supply", toGround[sweeps.AverageVoltage]+toSupply[sweeps.AverageVoltage], 9, 1e-9)
	near(t, "duty", toSupply[sweeps.Duty], toGround[sweeps.Duty], 1e-12)
}

func TestStallAndStart(t *testing.T) {
	b := pump()
	b.Load.CoulombTorque.UnmarshalText([]byte("1.2 mN m"))
	b.Load.StaticTorque.UnmarshalText([]byte("3 mN m"))
	m := mustNew(t, b, Options{})
	stalled, err := m.At(Setting{Supply: 5, Pot: 100e3, Temperature: Reference})
	if err != nil {
		t.Fatal(err)
	}
	if flagNames(stalled.Flags) != Stalled || stalled.Values[sweeps.Speed] != 0 {
		t.Errorf("at 5 V, 100 k: %v, speed %g", stalled.Flags, stalled.Values[sweeps.Speed])
	}
	running, err := m.At(at9V(1e3))
	if err != nil {
		t.Fatal(err)
	}
	if len(running.Flags) > 0 || running.Values[sweeps.Speed] == 0 {
		t.Errorf("at 9 V, 1 k: %v, speed %g", running.Flags, running.Values[sweeps.Speed])
	}
	th, err := m.Thresholds(at9V(0), 100, 300e3)
	if err != nil {
		t.Fatal(err)
	}
	if th.Start == nil || th.Stall == nil {
		t.Fatalf("thresholds %v", th)
	}
	if *th.Stall < *th.Start*(1-1e-5) {
		t.Errorf("stalls at %g ohm, before it would start at %g", *th.Stall, *th.Start)
	}
	just, _ := m.Start(at9V(*th.Start * 0.999))
	beyond, _ := m.Start(at9V(*th.Start * 1.001))
	if !just.Starts() || beyond.Starts() {
		t.Errorf("about the threshold: %+v, %+v", just, beyond)
	}
}

// Sticking friction above sliding friction: between the two the motor keeps turning but does not start.
func TestKeepsTurningButDoesNotStart(t *testing.T) {
	b := pump()
	b.Load.CoulombTorque.UnmarshalText([]byte("0.2 mN m"))
	b.Load.StaticTorque.UnmarshalText([]byte("4.5 mN m"))
	r, err := mustNew(t, b, Options{}).At(Setting{Supply: 6, Pot: 33e3, Temperature: Reference})
	if err != nil {
		t.Fatal(err)
	}
	if flagNames(r.Flags) != NoStart || r.Values[sweeps.Speed] == 0 {
		t.Errorf("%v, speed %g", r.Flags, r.Values[sweeps.Speed])
	}
}

// A stalled motor draws more than a running one.
func TestLockedDrawsMore(t *testing.T) {
	b := pump()
	rating := si.Amperes(0.2)
	b.Load.MaxCurrent = &rating
	m := mustNew(t, b, Options{})
	table, err := m.Stress(at9V(1e3))
	if err != nil {
		t.Fatal(err)
	}
	current := func(rows []Stress) Stress {
		for _, r := range rows {
			if r.Part == "motor" && r.What == "mean current" {
				return r
			}
		}
		t.Fatal("no motor current")
		return Stress{}
	}
	run, held := current(table.Running), current(table.Locked)
	if held.Value < 3*run.Value || held.Share() <= 1 {
		t.Errorf("running %v, locked %v", run, held)
	}
	near(t, "locked", held.Value, 0.9*9/12, 0.15) // nearly full duty over 12 ohm
	if held.Value > m.Peak(9) {
		t.Errorf("locked %g A above the bound of %g A", held.Value, m.Peak(9))
	}
	for _, rows := range [][]Stress{table.Running, table.Locked} {
		for _, r := range rows {
			t.Log(r)
		}
	}
}

func TestJudgeRefusesAboveRatings(t *testing.T) {
	b := pump()
	amps, watts := si.Amperes(1), si.Watts(10)
	b.Load.MaxCurrent, b.Load.MaxPower = &amps, &watts
	m := mustNew(t, b, Options{PotMaxCurrent: 2.5e-3, PotMaxVoltage: 16})
	fine, err := m.Judge([]Setting{at9V(10e3), at9V(100e3)})
	if err != nil {
		t.Fatal(err)
	}
	if len(fine) > 0 {
		t.Errorf("fine settings: %+v", fine)
	}
	hot, err := m.Judge([]Setting{at9V(10e3), {Supply: 18.5, Pot: 100, Temperature: Reference}})
	if err != nil {
		t.Fatal(err)
	}
	var pot, supply bool
	for _, f := range hot {
		pot = pot || f.Refuse && strings.Contains(f.Words, "wiper current")
		supply = supply || f.Refuse && strings.Contains(f.Words, "supply voltage")
	}
	if !pot || !supply {
		t.Errorf("18.5 V on 100 ohm: %+v", hot)
	}
	b.Load.StaticTorque.UnmarshalText([]byte("1 N m"))
	never, err := mustNew(t, b, Options{}).Judge([]Setting{at9V(10e3), at9V(20e3)})
	if err != nil {
		t.Fatal(err)
	}
	if last := never[len(never)-1]; !last.Refuse || last.Name != NoStart {
		t.Errorf("a motor that never starts: %+v", never)
	}
	if never[0].Count != 2 {
		t.Errorf("found at %d of 2 settings", never[0].Count)
	}
}

func TestDriverFlags(t *testing.T) {
	rb := ohms(4.7e3)
	for _, c := range []struct {
		name  string
		board func(b *sweeps.Board)
		s     Setting
		want  string
	}{
		{"base current too small", func(b *sweeps.Board) {
			b.Driver.Stage, b.Driver.Part.Name, b.Driver.BaseResistor = sweeps.StageNPN, "2N2222", &rb
		}, at9V(10e3), Unsaturated},
		{"bipolar timer on 5 V", func(b *sweeps.Board) { b.Driver.Part = sweeps.Transistor{RdsOn: 0.05, VgsTh: 1.5} }, Setting{Supply: 5, Pot: 10e3, Temperature: Reference}, NotFullyOn},
		{"no flyback", func(b *sweeps.Board) { b.Driver.Flyback = noDiode }, at9V(10e3), NoFlyback},
		{"gate too high", func(b *sweeps.Board) { b.Driver.Part = sweeps.Transistor{RdsOn: 0.05, VgsTh: 6} }, Setting{Supply: 5, Pot: 10e3, Temperature: Reference}, NeverOn},
		{"supply out of range", func(*sweeps.Board) {}, Setting{Supply: 14, Pot: 10e3, Temperature: Reference}, SupplyRange},
		{"load on the output", func(b *sweeps.Board) {
			b.Driver.Stage, b.Load = sweeps.StageNone, sweeps.Load{Kind: sweeps.ResistorLoad, Resistance: ohms(20)}
		}, at9V(10e3), OutputLimit},
	} {
		b := pump()
		c.board(&b)
		r, err := mustNew(t, b, Options{}).At(c.s)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(flagNames(r.Flags), c.want) {
			t.Errorf("%s: flags %v, want %s", c.name, r.Flags, c.want)
		}
		for q, v := range r.Values {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Errorf("%s: %s is %g", c.name, q, v)
			}
		}
	}
}

// The signs and sizes a technician knows: t_low goes with R·C of its own phase, speed with 1/K at light load.
func TestSensitivities(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	all, err := m.Sensitivities(at9V(10e3))
	if err != nil {
		t.Fatal(err)
	}
	of := map[string]Sensitivity{}
	for _, s := range all {
		of[s.Part] = s
	}
	near(t, "t_low by capacitor", of["capacitor"].Values[sweeps.TLow], 1, 2e-3)
	near(t, "frequency by capacitor", of["capacitor"].Values[sweeps.Frequency], -1, 2e-3)
	between2(t, "t_high by charge", of["charge"].Values[sweeps.THigh], 0.95, 1.05)
	between2(t, "t_low by charge", math.Abs(of["charge"].Values[sweeps.TLow]), 0, 0.02)
	between2(t, "t_low by pot", of["pot"].Values[sweeps.TLow], 0.9, 1)
	between2(t, "speed by torque constant", of["load.torque_constant"].Values[sweeps.Speed], -1.1, -0.4)
	if _, ok := of["supply_voltage"]; !ok {
		t.Error("no sensitivity to the supply")
	}
}

func TestWithMovesOnePart(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	more, err := m.With(map[string]float64{"capacitor": 110e-9})
	if err != nil {
		t.Fatal(err)
	}
	a, b := mustAt(t, m, at9V(10e3)), mustAt(t, more, at9V(10e3))
	near(t, "frequency", b[sweeps.Frequency], a[sweeps.Frequency]/1.1, 2e-4)
	if _, err := m.With(map[string]float64{"capacitance": 1}); err == nil {
		t.Error("an unknown part was accepted")
	}
	if _, err := m.With(map[string]float64{"capacitor": -1}); err == nil {
		t.Error("a negative part was accepted")
	}
	for _, p := range more.Parts() {
		if p.Name == "capacitor" && (p.Nominal != 110e-9 || math.Abs(p.Low/p.Nominal-0.95) > 1e-9) {
			t.Errorf("%+v", p)
		}
	}
}

// A voltage fed to pin 5 moves both levels, through the divider's own resistance.
func TestControlPin(t *testing.T) {
	b := bareBoard(timing(sweeps.Plain, 10e3, 10e3, 10e-9, noDiode))
	b.Timer.Part = "bipolar"
	b.Timing.Control = &sweeps.Control{Voltage: si.Volts(4), Resistance: si.Ohms(3333)}
	v := mustAt(t, mustNew(t, b, Options{}), at9V(0))
	near(t, "control voltage", v[sweeps.ControlVoltage], 5, 1e-9) // half way between 6 V and 4 V
}
