package circuit

import (
	"encoding/csv"
	"os"
	"strconv"
	"testing"
)

// Diodes of the reference tables (testdata/reference/README.md).
var (
	signal    = Diode{Is: 2.52e-9, N: 1.752, Rs: 0.568}
	schottkyA = Diode{Is: 3.17e-5, N: 1.373, Rs: 0.051, Eg: 0.69, Xti: 2}
	schottkyB = Diode{Is: 2.1e-7, N: 1.02, Rs: 2.3, Eg: 0.69, Xti: 2}
	rectifier = Diode{Is: 1.41e-8, N: 1.984, Rs: 0.034}
)

// stiff is a supply that nothing in these circuits can move.
var stiff = Source{Resistance: 1e-4, Bulk: 100e-6}

// ideal is a timer as in the reference tables.
func ideal(r7 float64) Timer {
	return Timer{
		Threshold: 2. / 3, Trigger: 0.5, DischargeResistance: r7,
		Drop: Levels{{5, []Point{{0, 0}}}}, Low: Levels{{5, []Point{{0, 0}}}},
		Clamp: Diode{Knee: 0.7}, MinSupply: 1,
	}
}

// bare is a board whose timing alone matters.
func bare(t Timing, r7 float64) Board {
	return Board{
		Source: stiff, Timing: t, Timer: ideal(r7),
		Load: Load{Kind: Resistor, Resistance: 1e6},
	}
}

// pump is the dosing-pump driver the practice bench is mostly made of:
// steered timing, a logic-level MOSFET, a small motor with a flyback diode.
func pump() Board {
	return Board{
		Source: Source{Resistance: 0.05, Bulk: 100e-6, Bleed: 4700},
		Timing: Timing{
			Network: Steered, Common: 10e3, Down: 470, Pot: PotDown,
			Capacitance: 100e-9, ChargeDiode: &signal, DischargeDiode: &signal,
		},
		Timer:   bipolar(),
		Driver:  Driver{Stage: NMOS, Resistance: 0.05, Body: &Diode{Knee: 0.6, Rs: 0.05}},
		Flyback: &schottkyA,
		Load: Load{
			Kind: Motor, Resistance: 12, Inductance: 5e-3, Constant: 8e-3, Burden: 0.3,
			StaticTorque: 0.6e-3, CoulombTorque: 0.4e-3, ViscousTorque: 0.2e-6, Inertia: 5e-8,
		},
	}
}

// bipolar has the typical figures of a bipolar 555 (TI SLFS022, SNAS548).
func bipolar() Timer {
	return Timer{
		Threshold: 2. / 3, Trigger: 0.5, TriggerCurrent: 0.5e-6, ThresholdCurrent: 30e-9,
		Delay: 0.3e-6, DischargeOffset: 0.037, DischargeResistance: 9.5,
		Drop:          Levels{{15, []Point{{0, 1.2}, {10e-3, 1.35}, {100e-3, 1.7}, {200e-3, 2.5}}}},
		DropPerKelvin: -4e-3,
		Low: Levels{
			{5, []Point{{0, 0.02}, {5e-3, 0.1}, {8e-3, 0.15}, {50e-3, 0.8}}},
			{15, []Point{{0, 0.02}, {10e-3, 0.1}, {50e-3, 0.4}, {100e-3, 2}}},
		},
		Clamp:     Diode{Knee: 0.7, Rs: 1},
		Quiescent: []Quiescent{{5, 3e-3}, {15, 10e-3}},
		MinSupply: 2.5, Rise: 100e-9, Fall: 100e-9,
	}
}

// mustNew powers a board from a supply of v volts that can give plenty.
func mustNew(tb testing.TB, b Board, v float64) *Sim {
	tb.Helper()
	s, err := New(b)
	if err != nil {
		tb.Fatal(err)
	}
	if err := s.SetSupply(v); err != nil {
		tb.Fatal(err)
	}
	if err := s.SetLimit(100); err != nil {
		tb.Fatal(err)
	}
	s.SetOutput(true)
	return s
}

// phases runs a few periods and gives the mean high and low time.
func phases(tb testing.TB, s *Sim, span float64) (high, low float64) {
	tb.Helper()
	e := NewEdges(s.Now(), s.Now()+span)
	if err := s.Run(s.Now()+span, e); err != nil {
		tb.Fatal(err)
	}
	r, f := e.Rising, e.Falls
	if len(f) > 0 && len(r) > 0 && f[0] < r[0] {
		f = f[1:]
	}
	n := min(len(r), len(f), len(r)-1)
	if n < 1 {
		tb.Fatalf("no whole period in %g s: %d rising, %d falling edges", span, len(r), len(f))
	}
	for k := range n {
		high += f[k] - r[k]
		low += r[k+1] - f[k]
	}
	return high / float64(n), low / float64(n)
}

// rows reads a reference table as one map a row.
func rows(tb testing.TB, name string) []map[string]string {
	tb.Helper()
	f, err := os.Open("../../../testdata/reference/" + name)
	if err != nil {
		tb.Fatal(err)
	}
	defer f.Close()
	all, err := csv.NewReader(f).ReadAll()
	if err != nil {
		tb.Fatal(err)
	}
	var out []map[string]string
	for _, r := range all[1:] {
		m := map[string]string{}
		for k, h := range all[0] {
			m[h] = r[k]
		}
		out = append(out, m)
	}
	return out
}

func number(tb testing.TB, m map[string]string, key string) float64 {
	tb.Helper()
	if m[key] == "" {
		return 0
	}
	v, err := strconv.ParseFloat(m[key], 64)
	if err != nil {
		tb.Fatalf("column %s: %v", key, err)
	}
	return v
}

// near checks that got is within a fraction of want.
func near(tb testing.TB, what string, got, want, fraction float64) {
	tb.Helper()
	if d := got/want - 1; !(d <= fraction && d >= -fraction) {
		tb.Errorf("%s = %.6g, want %.6g within %.3g %%: off by %+.3f %%", what, got, want, 100*fraction, 100*d)
	}
}

// inside checks that got is from lo to hi.
func inside(tb testing.TB, what string, got, lo, hi float64) {
	tb.Helper()
	if !(got >= lo && got <= hi) {
		tb.Errorf("%s: %.5g, want %.5g to %.5g", what, got, lo, hi)
	}
}
