package circuit

import (
	"math"
	"slices"
	"testing"
)

// readings are what instruments would show of a board over 0.2 s.
func readings(tb testing.TB, s *Sim) map[string]float64 {
	tb.Helper()
	t0 := s.Now()
	t1 := t0 + 0.2
	probes := map[string]Probe{
		"motor current": Through(LoadCurrent), "supply current": Through(SupplyCurrent),
		"average voltage": Between(LoadHi, LoadLo), "output": Between(TimerOut, Common), "speed": RotorSpeed(),
	}
	means := map[string]*Mean{}
	var all []Observer
	for name, p := range probes {
		means[name] = NewMean(p, t0, t1)
		all = append(all, means[name])
	}
	e := NewEdges(t0, t1)
	mustRun(tb, s, t1, append(all, e)...)
	out := map[string]float64{}
	for name, m := range means {
		out[name] = m.Value()
	}
	if n := len(e.Rising); n > 1 {
		out["period"] = (e.Rising[n-1] - e.Rising[0]) / float64(n-1)
	}
	return out
}

// onlooker keeps a board from leaping.
type onlooker struct{ from, to float64 }

func (o onlooker) Window() (from, to float64) { return o.from, o.to }
func (o onlooker) Observe(*Segment)           {}

// TestLeapEqualsIntegration: the same wait leapt over and integrated to the
// end gives the same readings within 0.1 %, in the middle of a run-up too.
func TestLeapEqualsIntegration(t *testing.T) {
	slow := pump() // a fan: its speed takes seconds
	slow.Load.Inertia, slow.Load.QuadraticTorque = 2e-6, 0.3e-9
	warm := pump()
	warm.Load.ThermalResistance, warm.Load.ThermalCapacity = 40, 0.2
	for name, c := range map[string]struct {
		b    Board
		pot  float64
		wait float64
	}{
		"pump": {pump(), 5e3, 1}, "narrow pulses": {pump(), 30e3, 1}, "run-up of a fan": {slow, 2e3, 0.7}, "fan up to speed": {slow, 5e3, 2}, "winding warms": {warm, 2e3, 1.5},
	} {
		t.Run(name, func(t *testing.T) {
			var got [2]map[string]float64
			for k := range got {
				s := mustNew(t, c.b, 9)
				if err := s.SetPot(c.pot); err != nil {
					t.Fatal(err)
				}
				if k == 1 {
					if err := s.Watch(onlooker{0, c.wait}); err != nil {
						t.Fatal(err)
					}
				}
				s.Advance(c.wait)
				got[k] = readings(t, s)
			}
			for what, want := range got[1] {
				near(t, what, got[0][what], want, 0.001)
			}
		})
	}
}

// TestUnevenRotor: cogging and commutation ripple show while somebody looks at the
// wave, and leave the mean of many teeth and of a long unobserved wait as they are.
func TestUnevenRotor(t *testing.T) {
	b := pump()
	even := mustNew(t, b, 9)
	b.Load.Cogging, b.Load.CoggingPerTurn = 0.05e-3, 12
	b.Load.Ripple, b.Load.RipplePerTurn = 0.03, 10
	uneven := mustNew(t, b, 9)
	var peak, speed, mean [2]float64
	for k, s := range []*Sim{even, uneven} {
		if err := s.SetPot(1e3); err != nil {
			t.Fatal(err)
		}
		s.Advance(3600)
		if !s.smooth {
			t.Error("unevenness is followed though nobody looks")
		}
		long := NewMean(Through(LoadCurrent), 3600, 3600.5) // leapt over
		mustRun(t, s, 3600.5, long)
		look := NewRecord(3601, 20e-6, 5000, Through(LoadCurrent))
		short, w := NewMean(Through(LoadCurrent), 3601, 3601.1), NewMean(RotorSpeed(), 3601, 3601.1) // integrated
		mustRun(t, s, 3601.1, look, short, w)
		peak[k], speed[k], mean[k] = slices.Max(look.Y[0])-slices.Min(look.Y[0]), w.Value(), long.Value()
		near(t, "mean current of many teeth, leapt over", long.Value(), short.Value(), 0.003)
	}
	near(t, "mean speed with cogging", speed[1], speed[0], 0.005)
	near(t, "mean current with cogging", mean[1], mean[0], 0.01)
	if peak[1] < 1.02*peak[0] {
		t.Errorf("ripple does not show: current swings %.4f A, without it %.4f A", peak[1], peak[0])
	}
}

// TestNight: nine hours at once end, whatever the board does. Integrated
// throughout, each case would take a quarter of an hour.
func TestNight(t *testing.T) {
	cogging := pump()
	cogging.Load.Cogging, cogging.Load.CoggingPerTurn = 0.05e-3, 12
	still := pump()
	still.Timing = Timing{Network: Clocked, Period: 1e6, Duty: 1}
	for name, c := range map[string]struct {
		b Board
		f func(*Sim)
	}{
		"running":  {pump(), func(*Sim) {}},
		"cogging":  {cogging, func(*Sim) {}},
		"dc":       {still, func(*Sim) {}},
		"locked":   {pump(), func(s *Sim) { s.SetLocked(true) }},
		"off":      {pump(), func(s *Sim) { s.Advance(1); s.SetOutput(false) }},
		"starving": {pump(), func(s *Sim) { _ = s.SetLimit(0.04) }},
		"shorted":  {pump(), func(s *Sim) { _ = s.SetShort(1); _ = s.SetLimit(0.5) }},
	} {
		t.Run(name, func(t *testing.T) {
			s := mustNew(t, c.b, 9)
			if err := s.SetPot(5e3); err != nil {
				t.Fatal(err)
			}
			c.f(s)
			s.Advance(9 * 3600)
			if d := math.Abs(s.Now() - 9*3600); d > 1e-6 {
				t.Errorf("at %g s", s.Now())
			}
		})
	}
}

// A supply that was switched off runs down by its bleeder, RC = 0.47 s: two long
// advances nobody looks at must give what small steps and exp(−t/RC) give.
func TestRunDownIsNotLeaptOver(t *testing.T) {
	decaying := func(steps ...float64) float64 {
		s, err := New(Board{
			Source: Source{Resistance: 0.05, Bulk: 1e-3, Bleed: 470},
			Timing: Timing{Network: Clocked, Period: 1e-3, Duty: 0.25},
			Timer:  Timer{Threshold: 2. / 3, Trigger: 0.5, MinSupply: 2},
			Driver: Driver{Stage: NMOS, Resistance: 0.05},
			Load:   Load{Kind: Resistor, Resistance: 1e6},
		})
		if err != nil {
			t.Fatal(err)
		}
		if err := s.SetSupply(8); err != nil {
			t.Fatal(err)
		}
		if err := s.SetLimit(1); err != nil {
			t.Fatal(err)
		}
		s.SetOutput(true)
		s.Advance(0.2)
		s.SetOutput(false)
		for _, until := range steps {
			s.Advance(until)
		}
		return s.State().Supply
	}
	var fine []float64
	for x := 0.25; x < 5.222; x += 0.05 {
		fine = append(fine, x)
	}
	want := 8 * math.Exp(-(5.222-0.2)/0.47)
	for name, got := range map[string]float64{"two long advances": decaying(2.2, 5.222), "small steps": decaying(append(fine, 5.222)...)} {
		if d := got - want; d > 1e-3 || d < -1e-3 {
			t.Errorf("%s leave %.4f V, want %.4f V", name, got, want)
		}
	}
}
