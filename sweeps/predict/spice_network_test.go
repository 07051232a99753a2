package predict

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// between draws from a logarithmic range.
func between(r *rand.Rand, low, high float64) float64 {
	return low * math.Pow(high/low, r.Float64())
}

var spiceDiodes = []string{"1N4148", "schottky-a", "schottky-b"}

// randomTiming draws a network's parts; the pot stands in it at a given share or not at all.
func randomTiming(r *rand.Rand, network sweeps.Network) (sweeps.Timing, float64) {
	t := sweeps.Timing{
		Network: network, Charge: fixedR(between(r, 1e3, 47e3)), Discharge: fixedR(between(r, 2e3, 68e3)),
		Capacitor:   si.Exactly(si.Farads(between(r, 4.7e-9, 1e-6))),
		ChargeDiode: tableDiodes[spiceDiodes[r.IntN(3)]], DischargeDiode: tableDiodes[spiceDiodes[r.IntN(3)]],
	}
	switch network {
	case sweeps.Plain:
		t.ChargeDiode, t.DischargeDiode = noDiode, noDiode
	case sweeps.Bypassed:
		t.DischargeDiode = noDiode
	case sweeps.Wiper:
		t.Discharge = sweeps.Resistor{}
		t.Track = fixedR(100e3)
		t.StopUp, t.StopDown = ohms(between(r, 100, 1e3)), ohms(between(r, 100, 1e3))
	case sweeps.OutputFed:
		t.Common = fixedR(between(r, 100, 2e3))
		if r.IntN(3) == 0 {
			t.ChargeDiode, t.DischargeDiode = noDiode, noDiode
			t.Common, t.Charge, t.Discharge = fixedR(between(r, 2e3, 68e3)), sweeps.Resistor{}, sweeps.Resistor{}
		}
	}
	return t, 0.05 + 0.9*r.Float64()
}

// straightOutput gives a timer whose output is drop and resistance, no other
// imperfection but those set: what a netlist can say in two lines.
func straightOutput(b *sweeps.Board, drop, rHigh, rLow float64) {
	row := func(i, v float64) sweeps.CurrentVoltage {
		return sweeps.CurrentVoltage{Current: si.Amperes(i), Voltage: si.Volts(v)}
	}
	b.Timer.Drop = []sweeps.CurrentVoltage{row(0, drop), row(1, drop+rHigh)}
	b.Timer.Low = []sweeps.CurrentVoltage{row(0, 0), row(1, rLow)}
}

// simulatedNetworks simulates eight boards of each network, those of the tables too,
// with the discharge pin's offset and pin currents, which the tables lack.
func simulatedNetworks(t *testing.T) (all []*accuracy) {
	needSpice(t)
	for k, network := range []sweeps.Network{sweeps.Plain, sweeps.Bypassed, sweeps.Steered, sweeps.Wiper, sweeps.OutputFed} {
		all = append(all, simulatedNetwork(t, network, rand.New(rand.NewPCG(uint64(k), 3)), Reference)...)
	}
	return append(all, simulatedNetwork(t, sweeps.Steered, rand.New(rand.NewPCG(9, 3)), Reference+25)...)
}

func simulatedNetwork(t *testing.T, network sweeps.Network, r *rand.Rand, temperature float64) []*accuracy {
	t.Helper()
	name := fmt.Sprintf("simulated %s at %g degC", network, temperature)
	high, low := &accuracy{name: name + " t_high", bound: 0.005}, &accuracy{name: name + " t_low", bound: 0.005}
	for n := 0; n < 8; {
		timing, share := randomTiming(r, network)
		b := bareBoard(timing)
		dischargePin(&b, between(r, 8, 30))
		b.Timer.DischargeOffset = &si.TolVoltage{Nominal: si.Volts(0.037)}
		b.Timer.TriggerCurrent = &si.TolCurrent{Nominal: si.Amperes(0.5e-6)}
		straightOutput(&b, 0.1, 50, 30)
		m := mustNew(t, b, Options{})
		s := Setting{Supply: 5 + 10*r.Float64(), Pot: share, Temperature: temperature}
		res, err := m.At(s)
		if err != nil {
			t.Fatal(err)
		}
		v := res.Values
		if !res.Oscillates || v[sweeps.Duty] < 0.02 || v[sweeps.Duty] > 0.98 { // the step would have to follow the short phase
			continue
		}
		n++
		d := &deck{stop: 3.2 * v[sweeps.Period], step: math.Min(v[sweeps.THigh], v[sweeps.TLow]) / 323.7, temperature: temperature}
		spiceTiming(d, m, s)
		if network == sweeps.OutputFed {
			d.add("bo o 0 i=v(h)>0.5 ? (v(o)-%g)/50 : v(o)/30\nrl0 o 0 1e6", s.Supply-0.1)
		}
		tr := d.simulate(t, "v(h)", "v(x)")
		h, l := tr.rhythm(t)
		what := fmt.Sprintf("case %d at %.3g V, %+v", n, s.Supply, m.nominal)
		high.add(t, v[sweeps.THigh], h, what)
		low.add(t, v[sweeps.TLow], l, what)
	}
	return []*accuracy{high, low}
}
