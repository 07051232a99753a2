package circuit

import (
	"math"
	"strings"
	"testing"
)

// TestForwardVoltage holds the table of forward voltages computed at 27 °C
// from published SPICE cards, V_F = N Vt ln(1 + I/Is) + I Rs.
func TestForwardVoltage(t *testing.T) {
	for _, c := range []struct {
		d     Diode
		i, vf float64
	}{
		{signal, 0.1e-3, 0.480}, {signal, 1e-3, 0.585}, {signal, 10e-3, 0.694}, {signal, 100e-3, 0.850}, {signal, 1, 1.465},
		{schottkyA, 0.1e-3, 0.051}, {schottkyA, 1e-3, 0.124}, {schottkyA, 10e-3, 0.205}, {schottkyA, 1, 0.419},
	} {
		v, r := c.d.forward(Nominal).drop(c.i)
		if math.Abs(v-c.vf) > 0.0006 {
			t.Errorf("V_F at %g A = %.4f V, want %.3f V", c.i, v, c.vf)
		}
		up, _ := c.d.forward(Nominal).drop(c.i * 1.0001)
		near(t, "slope", r, (up-v)/(c.i*0.0001), 0.001)
	}
}

// TestTemperature: a silicon junction loses 2 mV/K, a Schottky's leakage
// doubles every 10 K (common practice, no source).
func TestTemperature(t *testing.T) {
	cold, _ := signal.forward(Nominal).drop(1e-3)
	warm, _ := signal.forward(Nominal + 10).drop(1e-3)
	if tc := (warm - cold) / 10; tc < -2.3e-3 || tc > -1.7e-3 {
		t.Errorf("dV_F/dT = %.2f mV/K, want -2 mV/K", tc*1e3)
	}
	near(t, "Schottky leakage 10 K warmer", schottkyA.isAt(Nominal+10)/schottkyA.Is, 2, 0.05)
}

// TestNetworkBalance checks Kirchhoff's current law at W, with both branches
// taken from their own equations, and the derivative against a difference.
func TestNetworkBalance(t *testing.T) {
	for _, kind := range []NetworkKind{Plain, Bypassed, Steered, OutputFed} {
		b := Timing{Network: kind, Down: 33e3, ChargeDiode: &schottkyA, DischargeDiode: &schottkyA}
		if kind == Plain {
			b.ChargeDiode = nil
		}
		var n network
		n.build(&b, 0, Nominal)
		for _, v := range []float64{0, 1, 3, 4.5, 6, 8.9} {
			for _, source := range []float64{0.05, 4, 9} {
				i, di := n.solve(source, 10e3, v)
				if d := (source-n.w)/10e3 - i; math.Abs(d) > 1e-11 {
					t.Errorf("network %d, %g V, capacitor %g V: W is out of balance by %g A", kind, source, v, d)
				}
				up, down := through(&n.up, n.w-v), through(&n.down, v-n.w)
				if math.Abs(up-down-i) > 1e-8*math.Abs(i)+1e-12 {
					t.Errorf("network %d, %g V, capacitor %g V: branches carry %g A, solution says %g A", kind, source, v, up-down, i)
				}
				j, _ := n.solve(source, 10e3, v+1e-5)
				if d := (j - i) / 1e-5; math.Abs(d-di) > 1e-3*math.Abs(di)+1e-9 {
					t.Errorf("network %d, %g V, capacitor %g V: derivative %g S, difference says %g S", kind, source, v, di, d)
				}
			}
		}
	}
}

// through finds a branch's current by bisection on its junction voltage.
func through(b *branch, v float64) float64 {
	if b.kind == open {
		return 0
	}
	if b.kind == resistive {
		return v / b.r
	}
	i := func(u float64) float64 { return b.is*math.Expm1(u/b.nvt) + b.g*u }
	lo, hi := -20., 2.
	for range 200 {
		if u := (lo + hi) / 2; u+b.r*i(u) > v {
			hi = u
		} else {
			lo = u
		}
	}
	return i(lo)
}

func TestLevels(t *testing.T) {
	l := bipolar().Low
	for _, c := range []struct{ i, supply, v float64 }{
		{5e-3, 5, 0.1}, {50e-3, 15, 0.4}, {75e-3, 15, 1.2}, {0, 10, 0.02}, // rows and lines between them
		{5e-3, 4, 0.1}, {120e-3, 18, 2.64}, // beyond the ends
		{50e-3, 10, 0.6}, // half way between two supplies
	} {
		if v, _ := l.at(c.i, c.supply); math.Abs(v-c.v) > 1e-9 {
			t.Errorf("low level at %g A, %g V = %.4f V, want %.4f V", c.i, c.supply, v, c.v)
		}
	}
	q := bipolar().Quiescent // 3 mA at 5 V, 10 mA at 15 V (TI SLFS022)
	for _, c := range []struct{ v, i float64 }{{0, 0}, {2.5, 1.5e-3}, {5, 3e-3}, {10, 6.5e-3}, {15, 10e-3}} {
		if i := quiescent(q, c.v); math.Abs(i-c.i) > 1e-12 {
			t.Errorf("quiescent current at %g V = %g A, want %g A", c.v, i, c.i)
		}
	}
}

func TestNewRefuses(t *testing.T) {
	for _, c := range []struct {
		says  string
		alter func(*Board)
	}{
		{"capacitance", func(b *Board) { b.Timing.Capacitance = 0 }},
		{"both diodes", func(b *Board) { b.Timing.DischargeDiode = nil }},
		{"no place", func(b *Board) { b.Timing.Network = Plain }},
		{"unknown network", func(b *Board) { b.Timing.Network = 99 }},
		{"wiper", func(b *Board) { b.Timing.Pot = PotWiper }},
		{"threshold", func(b *Board) { b.Timer.Threshold = math.NaN() }},
		{"rise with current", func(b *Board) { b.Timer.Drop = Levels{{5, []Point{{0, 1}, {0, 2}}}} }},
		{"ascending supply", func(b *Board) { b.Timer.Low = Levels{b.Timer.Low[1], b.Timer.Low[0]} }},
		{"no points", func(b *Board) { b.Timer.Low = Levels{{Supply: 5}} }},
		{"base resistor", func(b *Board) { b.Driver = Driver{Stage: NPN} }},
		{"breakdown", func(b *Board) { b.Flyback = nil }},
		{"static torque", func(b *Board) { b.Load.StaticTorque = 0 }},
		{"inertia", func(b *Board) { b.Load.Inertia = 0 }},
		{"timing diode", func(b *Board) { b.Timing.ChargeDiode = &Diode{Knee: 0.7} }},
		{"bulk", func(b *Board) { b.Source.Bulk = 0 }},
		{"ambient", func(b *Board) { b.Ambient = 27 }},
		{"clock duty", func(b *Board) { b.Timing = Timing{Network: Clocked, Period: 1, Duty: 2} }},
	} {
		b := pump()
		c.alter(&b)
		if _, err := New(b); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("want an error about %q, got %v", c.says, err)
		}
	}
}

func TestSettersRefuse(t *testing.T) {
	s := mustNew(t, pump(), 9)
	for what, err := range map[string]error{
		"supply": s.SetSupply(-1), "nan": s.SetSupply(math.NaN()), "limit": s.SetLimit(math.Inf(1)), "pot": s.SetPot(-1),
		"short": s.SetShort(0), "ambient": s.SetAmbient(27), "change": s.Change(func(b *Board) { b.Timing.Capacitance = -1 }),
	} {
		if err == nil {
			t.Errorf("%s: nonsense was taken", what)
		}
	}
	if c := s.Board().Timing.Capacitance; c != 100e-9 {
		t.Errorf("a refused change left %g F behind", c)
	}
}

func TestNodeNames(t *testing.T) {
	for n := range nodes {
		got, err := ParseNode(n.String())
		if err != nil || got != n {
			t.Errorf("ParseNode(%q) = %v, %v", n, got, err)
		}
	}
	if _, err := ParseNode("load"); err == nil || !strings.Contains(err.Error(), "load_hi") {
		t.Errorf("an unknown node must name the known ones, got %v", err)
	}
}
