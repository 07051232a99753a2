package circuit

import (
	"math"
	"testing"
)

// plain100 is TI's figure example (SLFS022I): 5 k, 3 k, 0.15 µF.
func plain100(offset float64) Board {
	b := bare(Timing{Network: Plain, Common: 5e3, Down: 3e3, Capacitance: 0.15e-6}, 0)
	b.Timer.DischargeOffset = offset
	return b
}

// TestPlainFrequency: exact ln 2 figures and the effect of the discharge pin's
// drop, computed from t = RC ln(…) with the levels at thirds.
func TestPlainFrequency(t *testing.T) {
	for _, c := range []struct{ supply, offset, f, duty float64 }{
		{15, 0, 874.36, 8. / 11}, {15, 0.18, 868.04, 0.72202}, {5, 0.08, 865.88, 0.72022},
	} {
		s := mustNew(t, plain100(c.offset), c.supply)
		s.Advance(5e-3)
		high, low := phases(t, s, 10e-3)
		near(t, "frequency", 1/(high+low), c.f, 1e-4)
		near(t, "duty", high/(high+low), c.duty, 1e-4)
	}
}

// TestFirstCycle: from an empty capacitor the first high time is
// ln 3/ln 2 = 1.585 times the later ones.
func TestFirstCycle(t *testing.T) {
	b := plain100(0)
	b.Source.Bulk = 1e-6 // the supply is there at once
	s := mustNew(t, b, 15)
	e := NewEdges(0, 10e-3)
	if err := s.Run(10e-3, e); err != nil {
		t.Fatal(err)
	}
	later := e.Falls[2] - e.Rising[1]
	if e.Rising[0] < e.Falls[0] {
		later = e.Falls[2] - e.Rising[2]
	}
	near(t, "first high time", e.Falls[0]/later, 1.585, 0.002)
}

// TestStepLimit: halving every limit moves a period by less than 0.02 %.
func TestStepLimit(t *testing.T) {
	for _, b := range []Board{pump(), bare(Timing{Network: Bypassed, Common: 1e3, Down: 100e3, Capacitance: 10e-9, ChargeDiode: &schottkyA}, 15)} {
		period := func(fineness float64) float64 {
			s := mustNew(t, b, 5)
			s.fineness = fineness
			if err := s.SetPot(20e3); err != nil {
				t.Fatal(err)
			}
			s.Advance(0.05)
			high, low := phases(t, s, 0.05)
			return high + low
		}
		near(t, "period with half steps", period(0.5), period(1), 2e-4)
	}
}

// TestCapacitorTenPercent: C +10 % lowers the frequency by 9 ± 0.5 %.
func TestCapacitorTenPercent(t *testing.T) {
	s := mustNew(t, pump(), 9)
	if err := s.SetPot(20e3); err != nil {
		t.Fatal(err)
	}
	s.Advance(0.1)
	h0, l0 := phases(t, s, 0.1)
	if err := s.Change(func(b *Board) { b.Timing.Capacitance *= 1.1 }); err != nil {
		t.Fatal(err)
	}
	s.Advance(s.Now() + 0.1)
	h1, l1 := phases(t, s, 0.1)
	if drop := 1 - (h0+l0)/(h1+l1); math.Abs(drop-0.09) > 0.005 {
		t.Errorf("frequency drops by %.2f %%, want 9 ± 0.5 %%", 100*drop)
	}
}

// TestEffectsOnTiming holds figures of the circuit laws that were computed by
// transient simulation elsewhere: by how much one imperfection moves a time.
func TestEffectsOnTiming(t *testing.T) {
	steered := func(common, down float64) Board {
		return bare(Timing{Network: Steered, Common: common, Down: down, Capacitance: 100e-9, ChargeDiode: &signal, DischargeDiode: &signal}, 9.5)
	}
	run := func(b Board, supply float64) (high, low float64) {
		s := mustNew(t, b, supply)
		s.Advance(0.1)
		return phases(t, s, 0.2)
	}
	with := func(b Board, alter func(*Board)) Board { alter(&b); return b }
	base := steered(10e3, 100e3)

	_, l0 := run(base, 5)
	_, l1 := run(with(base, func(b *Board) { b.Timer.TriggerCurrent = 0.5e-6 }), 5)
	inside(t, "trigger current at 5 V with 100 k lengthens t_low, %", 100*(l1/l0-1), 2.5, 2.9)

	_, l1 = run(with(base, func(b *Board) { b.Timer.DischargeOffset = 0.037 }), 5)
	inside(t, "discharge offset at 5 V lengthens t_low, %", 100*(l1/l0-1), 1.5, 2.1)

	b := steered(1e3, 100e3)
	_, l0 = run(b, 9)
	_, l1 = run(with(b, func(b *Board) { b.Timer.Delay = 0.3e-6 }), 9)
	inside(t, "0.3 µs of delay with 1 k / 100 k lengthens t_low, µs", 1e6*(l1-l0), 10, 16)

	b = steered(10e3, 1e3)
	h0, _ := run(b, 5)
	h1, _ := run(with(b, func(b *Board) { b.Timing.Network, b.Timing.DischargeDiode = Bypassed, nil }), 5)
	inside(t, "bypassed instead of steered at 5 V with 1 k moves t_high, %", 100*math.Abs(h1/h0-1), 10, 18)

	for supply, want := range map[float64]float64{5: -1.7, 12: -0.6} {
		h0, l0 := run(base, supply)
		h1, l1 := run(with(base, func(b *Board) { b.Ambient = Nominal + 15 }), supply)
		moved := 100 * ((h1+l1)/(h0+l0) - 1)
		inside(t, "15 K warmer moves the period, %", moved, want-0.4, want+0.4)
	}
}

// TestOutputFed: a bipolar timer at 5 V charging from its own output stretches
// t_high 5 to 15 times or stops; a rail-to-rail output does not.
func TestOutputFed(t *testing.T) {
	b := bare(Timing{Network: OutputFed, Common: 1e3, Up: 10e3, Down: 10e3, Capacitance: 10e-9, ChargeDiode: &signal, DischargeDiode: &signal}, 10)
	s := mustNew(t, b, 5)
	s.Advance(0.05)
	h0, l0 := phases(t, s, 0.02)
	near(t, "rail to rail: t_high against t_low", h0, l0, 0.02)

	b.Timer = bipolar()
	s = mustNew(t, b, 5)
	e := NewEdges(0.1, 0.2)
	if err := s.Run(0.2, e); err != nil {
		t.Fatal(err)
	}
	if len(e.Rising) > 1 {
		high := e.Rising[1] - e.Rising[0] - l0
		inside(t, "bipolar at 5 V: t_high against rail to rail", high/h0, 3, 15)
	} else if !s.High() {
		t.Error("a timer that stops for want of charging voltage stops high")
	}
}

// TestMeterReadings: what a meter at the output shows on 9 V (common practice,
// no source): about 0.8 V at 10 k charging and 100 k discharging, 4.3 to 4.4 V
// with equal resistors, about 8.3 V at nearly full duty. The board is the
// commonest one, the charge diode across the discharge resistor.
func TestMeterReadings(t *testing.T) {
	for _, c := range []struct{ charge, discharge, lo, hi float64 }{
		{10e3, 100e3, 0.75, 0.87}, {10e3, 10e3, 4.25, 4.45}, {100e3, 1e3, 8.1, 8.4},
	} {
		timer := bipolar()
		timer.Drop = Levels{{9, []Point{{0, 0.7}, {1e-3, 1.2}, {0.1, 1.7}}}} // unloaded: one junction
		b := Board{
			Source: stiff, Timer: timer, Load: Load{Kind: Resistor, Resistance: 10e6},
			Timing: Timing{Network: Bypassed, Common: c.charge, Down: c.discharge, Capacitance: 100e-9, ChargeDiode: &signal},
		}
		s := mustNew(t, b, 9)
		s.Advance(0.1)
		m := NewMean(Between(TimerOut, Common), s.Now(), s.Now()+1)
		if err := s.Run(s.Now()+1, m); err != nil {
			t.Fatal(err)
		}
		inside(t, "meter, V", m.Value(), c.lo, c.hi)
	}
}
