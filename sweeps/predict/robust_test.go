package predict

import (
	"math"
	"math/rand/v2"
	"testing"

	"nightbench/sweeps"
)

// wholeBoard draws any network with any timer, stage and load of the catalogue.
func wholeBoard(t *testing.T, r *rand.Rand) (sweeps.Board, Setting) {
	networks := []sweeps.Network{sweeps.Plain, sweeps.Bypassed, sweeps.Steered, sweeps.Wiper, sweeps.OutputFed}
	timing, share := randomTiming(r, networks[r.IntN(5)])
	b := bareBoard(timing)
	b.Timer.Part = []string{"bipolar", "cmos", "ideal"}[r.IntN(3)]
	b.Load.Resistance = ohms(between(r, 5, 10e3))
	base := ohms(between(r, 100, 100e3))
	switch b.Driver.Stage = []sweeps.Stage{sweeps.StageNone, sweeps.StageNPN, sweeps.StageDarlington, sweeps.StageNMOS}[r.IntN(4)]; b.Driver.Stage {
	case sweeps.StageNone:
		b.Load.ToSupply = r.IntN(2) == 0
	case sweeps.StageNPN:
		b.Driver.Part.Name, b.Driver.BaseResistor = "2N2222", &base
	case sweeps.StageDarlington:
		b.Driver.Part.Name, b.Driver.BaseResistor = "BC517", &base
	case sweeps.StageNMOS:
		b.Driver.Part.Name = "logic-level-50m"
	}
	if r.IntN(3) > 0 {
		randomMotor(t, r, &b, false)
		if r.IntN(3) > 0 {
			b.Driver.Flyback = sweeps.Diode{Name: []string{"1N4001", "1N5819"}[r.IntN(2)]}
		}
	}
	return b, Setting{Supply: between(r, 2, 18), Pot: share, Temperature: -20 + 100*r.Float64(), Burden: r.Float64()}
}

// Whatever a user wires up, no value is ever not a number, infinite, or against
// nature: shares stay within 0 and 1, the mean voltage between the rails, power is not made.
func TestNoBoardGivesNonsense(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 1))
	oscillating := 0
	for n := range 2000 {
		b, s := wholeBoard(t, r)
		m, err := New(b, Options{})
		if err != nil {
			continue // refused in words: tested elsewhere
		}
		res, err := m.At(s)
		if err != nil {
			t.Fatal(err)
		}
		for q, v := range res.Values {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Fatalf("board %d: %s is %g; %+v at %+v", n, q, v, b, s)
			}
		}
		if !res.Oscillates {
			continue
		}
		oscillating++
		sane(t, n, res.Values, s)
		if _, err := m.Stress(s); err != nil {
			t.Fatal(err)
		}
		for q, p := range first(m.Draw(5, 1).At(s)) {
			if math.IsNaN(p.Low) || math.IsInf(p.High, 0) || p.Low > p.High {
				t.Fatalf("board %d: %s has the band %g to %g", n, q, p.Low, p.High)
			}
		}
	}
	if oscillating < 1000 {
		t.Errorf("only %d of 2000 boards oscillate: too few are tested", oscillating)
	}
}

func first[A, B any](a A, _ B) A { return a }

func sane(t *testing.T, n int, v map[sweeps.Quantity]float64, s Setting) {
	t.Helper()
	within := func(q sweeps.Quantity, low, high float64) {
		if x, ok := v[q]; ok && (x < low-1e-9 || x > high+1e-9) {
			t.Errorf("board %d at %+v: %s is %g, outside %g to %g", n, s, q, x, low, high)
		}
	}
	within(sweeps.Duty, 0, 1)
	within(sweeps.Conduction, 0, 1)
	within(sweeps.AverageVoltage, -1, s.Supply)
	within(sweeps.BackEMF, 0, s.Supply)
	within(sweeps.OutputDrop, 0, s.Supply)
	within(sweeps.MotorCurrent, -1e-9, math.Inf(1))
	if power, ok := v[sweeps.SupplyPower]; ok && v[sweeps.BackEMF]*v[sweeps.MotorCurrent] > power {
		t.Errorf("board %d: the shaft takes %g W of the supply's %g W", n, v[sweeps.BackEMF]*v[sweeps.MotorCurrent], power)
	}
}

// The inner loop of a band allocates nothing: ten thousand boards along a curve leave no litter.
func TestSolveAllocatesNothing(t *testing.T) {
	m := mustNew(t, pump(), Options{})
	for _, s := range []Setting{at9V(10e3), {Supply: 4.6, Pot: 100e3, Temperature: 40}} {
		c := s.conditions()
		if n := testing.AllocsPerRun(100, func() { m.solve(&m.nominal, c) }); n != 0 {
			t.Errorf("%g allocations at %+v", n, s)
		}
	}
}
