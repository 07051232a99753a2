package circuit

import (
	"math"
	"testing"
)

// energies adds up over its window where the source's energy goes.
type energies struct {
	t0, t1                          float64
	copper, turning, diode, channel float64
}

func (e *energies) Window() (from, to float64) { return e.t0, e.t1 }

func (e *energies) Observe(g *Segment) {
	a, b := math.Max(e.t0, g.T0), math.Min(e.t1, g.T1)
	if b <= a {
		return
	}
	s := g.sim
	add := func(sum *float64, power func(State) float64) {
		*sum += (b - a) / 6 * (power(g.At(a)) + 4*power(g.At((a+b)/2)) + power(g.At(b)))
	}
	add(&e.copper, func(x State) float64 { return x.Current * x.Current * (s.winding() + s.b.Load.Burden) })
	add(&e.turning, func(x State) float64 { return s.b.Load.Constant * x.Speed * x.Current })
	add(&e.diode, func(x State) float64 {
		if s.driven || x.Current <= 0 {
			return 0
		}
		return x.Current * (g.volts(LoadLo, &x) - x.Supply)
	})
	add(&e.channel, func(x State) float64 {
		if !s.driven {
			return 0
		}
		return x.Current * g.volts(LoadLo, &x)
	})
}

// TestEnergyBalance: over whole steady periods what the source delivers is
// what copper, diode, switch and rotor take, to 0.5 %; and the rotor's share is
// what friction takes.
func TestEnergyBalance(t *testing.T) {
	for _, c := range []struct{ period, duty float64 }{{1e-3, 0.3}, {1e-3, 0.7}, {0.1e-3, 0.5}, {4e-3, 0.5}} {
		b := pump()
		b.Timing = Timing{Network: Clocked, Period: c.period, Duty: c.duty}
		b.Timer.Quiescent, b.Source.Bleed = nil, 0
		s := mustNew(t, b, 9)
		s.Advance(2)
		s.Advance(math.Ceil(s.Now()/c.period) * c.period)
		e := &energies{t0: s.Now(), t1: s.Now() + 20*c.period}
		w, i := NewMean(RotorSpeed(), e.t0, e.t1), NewMean(Through(LoadCurrent), e.t0, e.t1)
		is := NewMean(Through(SupplyCurrent), e.t0, e.t1)
		if err := s.Run(e.t1, e, w, i, is); err != nil {
			t.Fatal(err)
		}
		in := is.Value() * (9 - is.Value()*b.Source.Resistance) * (e.t1 - e.t0)
		near(t, "energy out of the source", in, e.copper+e.turning+e.diode+e.channel, 0.005)
		l := &b.Load
		friction := w.Value() * (l.CoulombTorque + w.Value()*l.ViscousTorque)
		near(t, "power of the rotor", e.turning/(e.t1-e.t0), friction, 0.005)
		near(t, "mean torque", l.Constant*i.Value(), l.CoulombTorque+w.Value()*l.ViscousTorque, 0.002)
	}
}

// TestThreeLevels: with a flyback diode in discontinuous conduction the
// motor's terminals show the supply, then one diode drop below nothing, then
// the back-EMF, which is K times the speed.
func TestThreeLevels(t *testing.T) {
	b := pump()
	b.Timing = Timing{Network: Clocked, Period: 2e-3, Duty: 0.3}
	b.Load.Burden = 0
	s := mustNew(t, b, 9)
	s.Advance(2)
	from := math.Ceil(s.Now()/2e-3)*2e-3 + 1e-6 // just after the output has risen
	r := NewRecord(from, 10e-6, 200, Between(LoadHi, LoadLo), Through(LoadCurrent))
	if err := s.Run(from+2e-3, r); err != nil {
		t.Fatal(err)
	}
	emf := b.Load.Constant * s.State().Speed
	v, i := r.Y[0], r.Y[1]
	on := 0
	for v[on] < 8 { // the window may start in the low part
		on++
	}
	inside(t, "driven, V", v[on+5], 8.9, 9)
	inside(t, "at rest against the back-EMF", v[(on+190)%200]/emf, 0.995, 1.01)
	var freewheeling int
	for k := range v {
		if v[k] < 0 {
			freewheeling++
			inside(t, "freewheeling, V", v[k], -0.4, 0)
			if i[k] <= 0 {
				t.Errorf("freewheeling without current at sample %d", k)
			}
		}
	}
	if freewheeling < 5 {
		t.Errorf("only %d of 200 samples freewheel", freewheeling)
	}
	two := 0.3*9 - 0.7*0.3
	m := NewMean(Between(LoadHi, LoadLo), s.Now(), s.Now()+20e-3)
	if err := s.Run(s.Now()+20e-3, m); err != nil {
		t.Fatal(err)
	}
	if m.Value() < 1.5*two {
		t.Errorf("average %.2f V: it must lie far above the two-level formula's %.2f V", m.Value(), two)
	}
}

// TestBreakdown: without a flyback diode the interrupted winding rises to the
// switch's breakdown voltage.
func TestBreakdown(t *testing.T) {
	b := pump()
	b.Timing = Timing{Network: Clocked, Period: 1e-3, Duty: 0.5}
	b.Flyback, b.Driver.Breakdown = nil, 60
	s := mustNew(t, b, 9)
	m := NewMean(Between(LoadLo, Common), 0.1, 0.11)
	if err := s.Run(0.11, m); err != nil {
		t.Fatal(err)
	}
	near(t, "peak at the switch", m.Max, 60, 1e-3)
}

// TestStartAndStall: the motor twitches off only above its static torque, goes
// on below it, and stalls below its coulomb torque.
func TestStartAndStall(t *testing.T) {
	b := pump()
	b.Timing = Timing{Network: Clocked, Period: 0.1e-3, Duty: 1}
	b.Load.Burden, b.Driver.Resistance = 0, 0
	at := func(torque float64) float64 { return torque / b.Load.Constant * b.Load.Resistance }
	s := mustNew(t, b, 0)
	for _, c := range []struct {
		what   string
		supply float64
		turns  bool
	}{
		{"just below the static torque", 0.97 * at(0.6e-3), false}, {"just above it", 1.03 * at(0.6e-3), true},
		{"between static and coulomb torque", at(0.5e-3), true}, {"below the coulomb torque", 0.97 * at(0.4e-3), false},
		{"between them again", at(0.5e-3), false},
	} {
		if err := s.Change(func(b *Board) { b.Timer.MinSupply = 0.1 }); err != nil {
			t.Fatal(err)
		}
		if err := s.SetSupply(c.supply); err != nil {
			t.Fatal(err)
		}
		s.Advance(s.Now() + 2)
		if turns := s.State().Speed > 0; turns != c.turns {
			t.Errorf("%s: turning = %v, want %v (speed %g rad/s, %g A)", c.what, turns, c.turns, s.State().Speed, s.State().Current)
		}
	}
}

// TestLocked: a blocked rotor draws the winding's ohmic current, more than a
// turning one, and starts again when let go.
func TestLocked(t *testing.T) {
	s := mustNew(t, pump(), 9)
	if err := s.SetPot(5e3); err != nil {
		t.Fatal(err)
	}
	mean := func() float64 {
		s.Advance(s.Now() + 4)
		m := NewMean(Through(LoadCurrent), s.Now(), s.Now()+0.5)
		if err := s.Run(s.Now()+0.5, m); err != nil {
			t.Fatal(err)
		}
		return m.Value()
	}
	free := mean()
	s.SetLocked(true)
	locked := mean()
	s.SetLocked(false)
	again := mean()
	if locked < 2*free {
		t.Errorf("locked %.4f A against %.4f A running", locked, free)
	}
	near(t, "current after the rotor was let go", again, free, 0.003)
}

// TestOutputDrivesMotor: with no stage between, the output carries the motor.
// In its low phase the winding pulls it below ground, then the motor brakes
// itself through the output's lower transistor.
func TestOutputDrivesMotor(t *testing.T) {
	b := pump()
	b.Timing = Timing{Network: Clocked, Period: 5e-3, Duty: 0.5}
	b.Driver, b.Flyback = Driver{}, nil
	s := mustNew(t, b, 9)
	s.Advance(1)
	v := NewMean(Between(TimerOut, Common), s.Now(), s.Now()+0.05)
	i := NewMean(Through(LoadCurrent), s.Now(), s.Now()+0.05)
	o := NewMean(Through(OutputCurrent), s.Now(), s.Now()+0.05)
	if err := s.Run(s.Now()+0.05, v, i, o); err != nil {
		t.Fatal(err)
	}
	inside(t, "clamped above the supply while the braking current dies, V", v.Max, 9.7, 10)
	inside(t, "output below ground, V", v.Min, -1.5, -0.7)
	if i.Min >= 0 {
		t.Errorf("braking current is %g A; it must be negative", i.Min)
	}
	near(t, "the output carries the motor", o.Value(), i.Value(), 1e-6)
}

// TestGain: a transistor short of base current holds the load current down.
func TestGain(t *testing.T) {
	b := bare(Timing{Network: Clocked, Period: 1, Duty: 1}, 1)
	b.Load.Resistance = 10
	b.Driver = Driver{Stage: NPN, Saturation: 0.1, BaseResistor: 10e3, Vbe: 0.7, Gain: 100}
	s := mustNew(t, b, 9)
	s.Advance(0.01)
	near(t, "starved load current", s.Look(Through(LoadCurrent)), 100*(9-0.7)/10e3, 0.001)
	if err := s.Change(func(b *Board) { b.Driver.BaseResistor = 470 }); err != nil {
		t.Fatal(err)
	}
	s.Advance(0.02)
	near(t, "load current", s.Look(Through(LoadCurrent)), (9-0.1)/10, 0.001)
	near(t, "transistor drop", s.Look(Between(LoadLo, Common)), 0.1, 0.001)
}

// TestWarming: the winding settles at ambient plus thermal resistance times
// its heat, and its resistance follows copper, 0.39 %/K.
func TestWarming(t *testing.T) {
	b := pump()
	b.Timing = Timing{Network: Clocked, Period: 1e-3, Duty: 0.6}
	b.Load.ThermalResistance, b.Load.ThermalCapacity = 20, 5
	s := mustNew(t, b, 9)
	s.SetLocked(true)
	s.Advance(2000) // 20 time constants
	i := NewMean(Through(LoadCurrent), s.Now(), s.Now()+0.01)
	e := &energies{t0: s.Now(), t1: s.Now() + 0.01}
	if err := s.Run(s.Now()+0.01, i, e); err != nil {
		t.Fatal(err)
	}
	heat := e.copper / 0.01 * s.winding() / (s.winding() + b.Load.Burden)
	near(t, "rise", s.State().Winding-Nominal, 20*heat, 0.01)
	near(t, "winding", s.winding(), 12*(1+0.0039*(s.State().Winding-Nominal)), 1e-9)
}
