package circuit

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// TestAnyBoard: whatever sensible or foolish board is wired up, its nodes stay
// finite and near the rails, and the work for a period is bounded.
func TestAnyBoard(t *testing.T) {
	const span = 0.008 // s
	rapid.Check(t, func(r *rapid.T) {
		decades := func(name string, lo, hi float64) float64 {
			return math.Pow(10, rapid.Float64Range(math.Log10(lo), math.Log10(hi)).Draw(r, name))
		}
		b := pump()
		kind := rapid.SampledFrom([]NetworkKind{Plain, Bypassed, Steered, Wiper, OutputFed}).Draw(r, "network")
		d := rapid.SampledFrom([]*Diode{&signal, &schottkyA, &schottkyB}).Draw(r, "diode")
		b.Timing = Timing{Network: kind, Common: decades("common", 1e3, 1e6), Down: decades("down", 1, 1e6), Pot: PotDown, Capacitance: decades("capacitance", 10e-9, 10e-6)}
		if kind != Plain {
			b.Timing.ChargeDiode = d
		}
		if kind > Bypassed {
			b.Timing.DischargeDiode = d
		}
		if kind == Wiper {
			b.Timing.Pot, b.Timing.PotTrack, b.Timing.PotWiperOhms = PotWiper, 100e3, 75
		}
		b.Driver.Stage = rapid.SampledFrom([]Stage{StageNone, NPN, NMOS}).Draw(r, "stage")
		b.Driver.BaseResistor, b.Driver.Vbe, b.Driver.Gain = 1e3, 0.7, 100
		b.Load.ToSupply = rapid.Bool().Draw(r, "to supply")
		b.Load.Kind = rapid.SampledFrom([]LoadKind{Resistor, Motor}).Draw(r, "load")
		b.Load.Inertia = decades("inertia", 1e-8, 1e-5)
		b.Timer.PushPull = rapid.Bool().Draw(r, "push-pull")

		s, err := New(b)
		if err != nil {
			r.Fatal(err)
		}
		supply := rapid.Float64Range(0, 15).Draw(r, "supply")
		for _, err := range []error{s.SetSupply(supply), s.SetLimit(decades("limit", 5e-3, 10)), s.SetPot(decades("pot", 1, 100e3))} {
			if err != nil {
				r.Fatal(err)
			}
		}
		s.SetOutput(true)
		steps, turns := counter{}, NewEdges(0, span)
		probes := make([]*Mean, nodes)
		all := []Observer{&steps, turns}
		for n := range nodes {
			probes[n] = NewMean(Between(n, Common), 0, span)
			all = append(all, probes[n])
		}
		if err := s.Run(span, all...); err != nil {
			r.Fatal(err)
		}
		for n, m := range probes {
			if v := m.Value(); !(v > -3 && v < supply+25 && m.Min > -15 && m.Max < supply+25) {
				r.Errorf("%v: mean %g V, %g V to %g V on a supply of %g V", Node(n), v, m.Min, m.Max, supply)
			}
		}
		if n := len(turns.Rising); steps.n > 5000+100*n {
			r.Errorf("%d steps for %d periods", steps.n, n)
		}
	})
}
