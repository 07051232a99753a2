package predict

import (
	"math"
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

func at9V(pot float64) Setting { return Setting{Supply: 9, Pot: pot, Temperature: Reference} }

func TestSameSeedSameBand(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	a, _ := m.Draw(500, 7).At(at9V(10e3))
	b, _ := m.Draw(500, 7).At(at9V(10e3))
	if d := cmp.Diff(a, b); d != "" {
		t.Errorf("the same seed gives another band: %s", d)
	}
	c, _ := m.Draw(500, 8).At(at9V(10e3))
	if a[sweeps.Frequency] == c[sweeps.Frequency] {
		t.Error("another seed gives the same band")
	}
	few, many := m.Draw(3, 7), m.Draw(500, 7)
	if few.draws[2] != many.draws[2] {
		t.Error("the third board drawn depends on how many follow")
	}
}

// With the capacitor's 5 % alone, a rectangular tolerance, the band of the period is ±4.75 %: 95 % of the range.
func TestBandOfOnePart(t *testing.T) {
	tm := timing(sweeps.Plain, 10e3, 10e3, 100e-9, noDiode)
	tm.Capacitor = within(tm.Capacitor, 0.05)
	p, flags := mustNew(t, bareBoard(tm), Options{}).Draw(20000, 1).At(Setting{Supply: 9, Temperature: Reference})
	if len(flags) > 0 {
		t.Errorf("flags %v", flags)
	}
	v := p[sweeps.Period]
	between2(t, "low", v.Low/v.Value-1, -0.0485, -0.0465)
	between2(t, "high", v.High/v.Value-1, 0.0465, 0.0485)
	if v.Unit != si.Second {
		t.Errorf("unit %s", v.Unit)
	}
}

// Without tolerances low = value = high.
func TestNoToleranceNoBand(t *testing.T) {
	b := bareBoard(timing(sweeps.Plain, 10e3, 10e3, 100e-9, noDiode))
	p, _ := mustNew(t, b, Options{}).Draw(100, 1).At(Setting{Supply: 9, Temperature: Reference})
	for q, v := range p {
		if v.Low != v.Value || v.High != v.Value {
			t.Errorf("%s: %g to %g about %g", q, v.Low, v.High, v.Value)
		}
	}
}

// A curve's points move together: every draw keeps its parts along the pot, so the
// ratio of two periods varies far less than either.
func TestCurveKeepsItsBoards(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	e := m.Draw(2000, 3)
	pots := []float64{1e3, 10e3, 100e3}
	c := e.Curve(9, pots, Reference)
	if c.Supply != 9 || len(c.Pot) != 3 {
		t.Fatalf("curve of %g V with %d points", c.Supply, len(c.Pot))
	}
	for k, pot := range pots {
		p, _ := e.At(at9V(pot))
		for q, line := range c.Quantities {
			if *line.Value[k] != p[q].Value || *line.Low[k] != p[q].Low || *line.High[k] != p[q].High {
				t.Errorf("%s at %g ohm: the curve has %g (%g to %g), the setpoint %v", q, pot, *line.Value[k], *line.Low[k], *line.High[k], p[q])
			}
		}
	}
	var single, ratio []float64
	for i := range e.draws {
		a, b := m.solve(&e.draws[i], at9V(1e3).conditions()), m.solve(&e.draws[i], at9V(2e3).conditions())
		single = append(single, a.low)
		ratio = append(ratio, a.low/b.low)
	}
	if s, r := relativeWidth(single), relativeWidth(ratio); r > s/3 {
		t.Errorf("t_low varies by %.3f, its ratio along the curve by %.3f", s, r)
	}
}

func relativeWidth(v []float64) float64 {
	low, high := interval95(v)
	return 2 * (high - low) / (high + low)
}

func TestSomeDrawsStop(t *testing.T) {
	b := fed(10e3, 10e6)
	b.Timing.Capacitor = within(b.Timing.Capacitor, 0.05)
	b.Timer.Drop = []sweeps.CurrentVoltage{{Voltage: si.Volts(1.66)}}
	b.Timer.TriggerCurrent = &si.TolCurrent{}
	p, flags := mustNew(t, b, Options{}).Draw(1000, 1).At(at5V())
	if len(p) == 0 || len(flags) == 0 || flags[len(flags)-1].Name != NoOscillation {
		t.Errorf("predictions %d, flags %v", len(p), flags)
	}
	for q, v := range p {
		if math.IsNaN(v.Low) || math.IsNaN(v.High) {
			t.Errorf("%s has a band of %g to %g", q, v.Low, v.High)
		}
	}
}

func TestStoppedSetpointsAreGapsInACurve(t *testing.T) {
	b := fed(10e3, 10e6)
	b.Timing.Charge = sweeps.Resistor{Pot: true}
	b.Timer.Drop = []sweeps.CurrentVoltage{{Voltage: si.Volts(2.5)}}
	c := mustNew(t, b, Options{}).Draw(20, 1).Curve(5, []float64{1e3, 10e3}, Reference)
	if _, ok := c.Quantities[sweeps.Duty]; ok {
		t.Error("duty has a line although the board stops everywhere")
	}
	if c := mustNew(t, b, Options{}).Draw(20, 1).Curve(15, []float64{-1, 10e3}, Reference); c.Quantities[sweeps.Duty].Value[0] != nil || c.Quantities[sweeps.Duty].Value[1] == nil {
		t.Error("a pot of -1 ohm should be a gap, 10 k not")
	}
}

func TestQuantiles(t *testing.T) {
	var v []float64
	for i := range 1001 {
		v = append(v, float64((i*380)%1001))
	}
	low, high := interval95(v)
	near(t, "2.5 % point", low, 25, 1e-12)
	near(t, "97.5 % point", high, 975, 1e-12)
	low, high = interval95([]float64{3})
	if low != 3 || high != 3 {
		t.Errorf("of one value: %g to %g", low, high)
	}
	same := make([]float64, 5000)
	if low, high := interval95(same); low != 0 || high != 0 {
		t.Errorf("of equal values: %g to %g", low, high)
	}
}

// A motor whose speed changes within a period is flagged, and its band widened.
func TestFastMotorWidensTheBand(t *testing.T) {
	b := pump()
	slow, flags := mustNew(t, b, Options{}).Draw(400, 1).At(at9V(10e3))
	if len(flags) > 0 {
		t.Fatalf("flags %v", flags)
	}
	b.Load.Inertia.UnmarshalText([]byte("0.5 g cm2"))
	fast, flags := mustNew(t, b, Options{}).Draw(400, 1).At(at9V(10e3))
	if len(flags) != 1 || flags[0].Name != SpeedRipple {
		t.Errorf("flags %v, want %s", flags, SpeedRipple)
	}
	width := func(p sweeps.Prediction) float64 { return p.High - p.Low }
	if width(fast[sweeps.BackEMF]) <= width(slow[sweeps.BackEMF]) || width(fast[sweeps.Duty]) != width(slow[sweeps.Duty]) {
		t.Errorf("band of back-EMF %g and %g, of duty %g and %g", width(fast[sweeps.BackEMF]), width(slow[sweeps.BackEMF]), width(fast[sweeps.Duty]), width(slow[sweeps.Duty]))
	}
}

// Where the laws are nearly straight, the band is what the sensitivities and the
// tolerances give by first-order propagation (JCGM 100, 5.1.2).
func TestBandAgreesWithSensitivities(t *testing.T) {
	m := mustNew(t, pump(), Options{PotTolerance: 0.05})
	s := at9V(33e3)
	all, err := m.Sensitivities(s)
	if err != nil {
		t.Fatal(err)
	}
	p, _ := m.Draw(20000, 1).At(s)
	for _, q := range []sweeps.Quantity{sweeps.Frequency, sweeps.TLow, sweeps.Speed} {
		var variance float64
		for _, part := range m.Parts() {
			for _, x := range all {
				if x.Part == part.Name {
					half := (part.High - part.Low) / 2 / part.Nominal
					variance += math.Pow(x.Values[q]*half, 2) / 3
				}
			}
		}
		band := (p[q].High - p[q].Low) / 2 / p[q].Value
		between2(t, string(q)+": band over 1.96 u", band/(1.96*math.Sqrt(variance)), 0.8, 1.1)
	}
}
