package circuit

import (
	"math"
	"testing"
)

// resistive is a load of ohms switched on for good, no timer current.
func resistiveLoad(ohms float64) Board {
	b := bare(Timing{Network: Clocked, Period: 1, Duty: 1}, 1)
	b.Source = Source{Resistance: 0.05, Bulk: 100e-6}
	b.Driver = Driver{Stage: NMOS}
	b.Load.Resistance = ohms
	return b
}

func mustRun(tb testing.TB, s *Sim, until float64, o ...Observer) {
	tb.Helper()
	if err := s.Run(until, o...); err != nil {
		tb.Fatal(err)
	}
}

// TestCurrentLimit: under a load that wants more, the supply holds its current
// and the board starves to limit × resistance; released, the voltage returns.
func TestCurrentLimit(t *testing.T) {
	s := mustNew(t, resistiveLoad(10), 9)
	s.Advance(0.1)
	near(t, "supply", s.Look(Between(Supply, Common)), 9*10/10.05, 1e-6)
	if s.Limiting() {
		t.Error("limiting at 0.9 A of 100 A")
	}
	if err := s.SetLimit(0.5); err != nil {
		t.Fatal(err)
	}
	m := NewMean(Through(SupplyCurrent), 0.1, 0.2)
	mustRun(t, s, 0.2, m)
	near(t, "starved supply", s.Look(Between(Supply, Common)), 5, 1e-3)
	near(t, "limited current", m.Value(), 0.5, 1e-6)
	if m.Max > 0.5+1e-9 || !s.Limiting() {
		t.Errorf("limiting = %v, peak %g A", s.Limiting(), m.Max)
	}
	if err := s.SetLimit(2); err != nil {
		t.Fatal(err)
	}
	s.Advance(0.3)
	near(t, "supply again", s.Look(Between(Supply, Common)), 9*10/10.05, 1e-6)
}

// TestOutputOff: off, the bulk capacitance runs down through the load with its
// own time constant; the source delivers nothing.
func TestOutputOff(t *testing.T) {
	b := resistiveLoad(100)
	b.Timer.MinSupply = 0.01
	s := mustNew(t, b, 9)
	s.Advance(0.1)
	s.SetOutput(false)
	m := NewMean(Through(SupplyCurrent), 0.1, 0.11)
	v0 := s.State().Supply
	mustRun(t, s, 0.11, m) // one time constant, 100 ohm × 100 µF
	near(t, "supply after one time constant", s.State().Supply, v0/math.E, 2e-3)
	if m.Value() != 0 {
		t.Errorf("an output that is off delivers %g A", m.Value())
	}
	s.Advance(1000)
	inside(t, "after a long time, V", s.State().Supply, 0, 0.02)
}

// TestLowered: the source can't pull its output down; it falls as the load lets it.
func TestLowered(t *testing.T) {
	s := mustNew(t, resistiveLoad(100), 9)
	s.Advance(0.1)
	if err := s.SetSupply(5); err != nil {
		t.Fatal(err)
	}
	s.Advance(0.1 + 10e-3*math.Log(9./5)*0.5)
	near(t, "half way in time", s.State().Supply, 9*math.Sqrt(5./9), 2e-3)
	s.Advance(0.2)
	near(t, "settled", s.State().Supply, 5*100/100.05, 1e-6)
}

// TestShort: a short pulls the board down to limit × its ohms, the timer dies
// and comes back when the short is gone.
func TestShort(t *testing.T) {
	s := mustNew(t, pump(), 9)
	for _, err := range []error{s.SetPot(5e3), s.SetLimit(1)} {
		if err != nil {
			t.Fatal(err)
		}
	}
	s.Advance(1)
	if err := s.SetShort(0.5); err != nil {
		t.Fatal(err)
	}
	s.Advance(3)
	near(t, "shorted supply", s.State().Supply, 0.5, 0.01)
	if s.High() || s.State().Speed != 0 {
		t.Errorf("a dead board: output high = %v, speed %g rad/s", s.High(), s.State().Speed)
	}
	if err := s.SetShort(math.Inf(1)); err != nil {
		t.Fatal(err)
	}
	s.Advance(4)
	if s.State().Speed == 0 {
		t.Error("the motor does not turn after the short was taken away")
	}
}

// TestHeldUp: off, a turning motor feeds the board through the switch's body
// diode until it slows down, then everything ends at nothing.
func TestHeldUp(t *testing.T) {
	b := pump()
	b.Load.Inertia, b.Load.CoulombTorque, b.Load.StaticTorque = 1e-6, 0.05e-3, 0.1e-3
	s := mustNew(t, b, 12)
	if err := s.SetPot(1e3); err != nil {
		t.Fatal(err)
	}
	s.Advance(20)
	s.SetOutput(false)
	s.Advance(s.Now() + 0.1)
	emf := b.Load.Constant * s.State().Speed
	inside(t, "supply below the back-EMF, V", emf-s.State().Supply, 0, 1.2)
	s.Advance(s.Now() + 1000)
	x := s.State()
	inside(t, "supply in the end, V", x.Supply, 0, 1e-3)
	inside(t, "speed in the end", x.Speed, 0, 1e-3)
}

// TestStarvedMotor: with the limit below the motor's need the board goes on in
// its own way, the mean current at or below the limit.
func TestStarvedMotor(t *testing.T) {
	s := mustNew(t, pump(), 9)
	for _, err := range []error{s.SetPot(1e3), s.SetLimit(0.04)} {
		if err != nil {
			t.Fatal(err)
		}
	}
	s.Advance(1)
	m := NewMean(Through(SupplyCurrent), 1, 2)
	v := NewMean(Between(Supply, Common), 1, 2)
	mustRun(t, s, 2, m, v)
	inside(t, "mean current, A", m.Value(), 0.01, 0.0400001)
	inside(t, "starved supply, V", v.Value(), 1, 8.5)
	s.Advance(20000) // restless or not, a long wait ends
}

// TestDead: without supply every node is at nothing, whatever hangs on the pin.
func TestDead(t *testing.T) {
	b := bare(Timing{Network: Plain, Common: 1e3, Down: 10e3, Capacitance: 100e-9}, 10)
	b.Load = Load{Kind: Resistor, Resistance: 100, ToSupply: true}
	for _, alter := range []func(*Board){
		func(*Board) {}, func(b *Board) { b.Load.ToSupply = false }, func(b *Board) { b.Driver.Stage = NMOS },
		func(b *Board) { b.Driver = Driver{Stage: NPN, BaseResistor: 1e3, Vbe: 0.7} },
	} {
		alter(&b)
		s := mustNew(t, b, 0.5) // below what the timer needs
		s.Advance(1)
		inside(t, "dead output, V", s.Look(Between(TimerOut, Common)), 0, 0.51)
		inside(t, "dead load, A", s.Look(Through(LoadCurrent)), -1e-12, 1e-12)
		s.SetOutput(false)
		s.Advance(1000)
		for n := range nodes {
			inside(t, n.String()+", V", s.Look(Between(n, Common)), 0, 0.51)
		}
	}
}
