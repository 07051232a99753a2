package predict

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"sort"
	"strconv"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// The tables of testdata/reference were made with a circuit simulator and know no
// closed form; their README says how. The bounds are the project's accuracy promise.

// record is a row of a table, by column.
type record map[string]string

func (r record) num(t *testing.T, column string) float64 {
	t.Helper()
	if r[column] == "" {
		return 0
	}
	x, err := strconv.ParseFloat(r[column], 64)
	if err != nil {
		t.Fatalf("column %s: %v", column, err)
	}
	return x
}

func table(t *testing.T, name string) []record {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "reference", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	lines, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var out []record
	for _, l := range lines[1:] {
		r := record{}
		for i, c := range lines[0] {
			r[c] = l[i]
		}
		out = append(out, r)
	}
	return out
}

// accuracy collects relative errors of one quantity, to be printed and held to a bound.
type accuracy struct {
	name  string
	bound float64
	errs  []float64
}

func (a *accuracy) add(t *testing.T, got, want float64, what string) {
	t.Helper()
	e := math.Abs(got/want - 1)
	a.errs = append(a.errs, e)
	if !(e <= a.bound) {
		t.Errorf("%s: %s is %.6g, the table has %.6g: %.3f %% apart, at most %.3f %%", what, a.name, got, want, 100*e, 100*a.bound)
	}
}

// percentile of the absolute relative errors.
func (a *accuracy) percentile(p float64) float64 {
	s := append([]float64(nil), a.errs...)
	sort.Float64s(s)
	return s[int(p*float64(len(s)-1))]
}

func (a *accuracy) String() string {
	return fmt.Sprintf("%-42s %4d values   median %8.2g %%   90 %% within %8.2g %%   worst %8.2g %%   promised %6.3f %%",
		a.name, len(a.errs), 100*a.percentile(0.5), 100*a.percentile(0.9), 100*a.percentile(1), 100*a.bound)
}

var tableDiodes = map[string]sweeps.Diode{
	"":           {None: true},
	"1N4148":     {Is: 2.52e-9, N: 1.752, Rs: 0.568},
	"schottky-a": {Is: 3.17e-5, N: 1.373, Rs: 0.051},
	"schottky-b": {Is: 2.1e-7, N: 1.02, Rs: 2.3},
}

func ohms(x float64) si.TolResistance { return si.Exactly(si.Ohms(x)) }

func fixedR(x float64) sweeps.Resistor { return sweeps.Resistor{Value: ohms(x)} }

// bareBoard is an ideal timer with a plain resistor on its output: only the timing network matters.
func bareBoard(t sweeps.Timing) sweeps.Board {
	return sweeps.Board{
		Name: "bare", Timing: t, Timer: sweeps.Timer{Part: "ideal"},
		Driver: sweeps.Driver{Stage: sweeps.StageNone, Flyback: sweeps.Diode{None: true}},
		Load:   sweeps.Load{Kind: sweeps.ResistorLoad, Resistance: ohms(1e6)},
	}
}

func dischargePin(b *sweeps.Board, r float64) {
	p := ohms(r)
	b.Timer.DischargeResistance = &p
}

func mustNew(t testing.TB, b sweeps.Board, o Options) *Model {
	t.Helper()
	m, err := New(b, o)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func mustAt(t testing.TB, m *Model, s Setting) map[sweeps.Quantity]float64 {
	t.Helper()
	r, err := m.At(s)
	if err != nil {
		t.Fatal(err)
	}
	if !r.Oscillates {
		t.Fatalf("does not oscillate: %v", r.Flags)
	}
	return r.Values
}

func tableTiming(t *testing.T, r record) (sweeps.Board, Setting) {
	d := tableDiodes[r["diode"]]
	timing := sweeps.Timing{
		Network: sweeps.Network(r["network"]), Charge: fixedR(r.num(t, "r1")),
		Capacitor: si.Exactly(si.Farads(r.num(t, "c"))), ChargeDiode: d, DischargeDiode: d,
	}
	if timing.Network == sweeps.Wiper {
		timing.Track = fixedR(r.num(t, "pot"))
	} else {
		timing.Discharge = fixedR(r.num(t, "r2"))
	}
	b := bareBoard(timing)
	dischargePin(&b, r.num(t, "r_discharge_pin"))
	return b, Setting{Supply: r.num(t, "vcc"), Pot: r.num(t, "wiper"), Temperature: Reference}
}

func timingTable(t *testing.T) []*accuracy {
	high, low := &accuracy{name: "timing.csv t_high", bound: 0.003}, &accuracy{name: "timing.csv t_low", bound: 0.003}
	for i, r := range table(t, "timing.csv") {
		b, s := tableTiming(t, r)
		v := mustAt(t, mustNew(t, b, Options{}), s)
		what := fmt.Sprintf("row %d, %s %s at %g V", i+1, r["network"], r["diode"], s.Supply)
		high.add(t, v[sweeps.THigh], r.num(t, "t_high"), what)
		low.add(t, v[sweeps.TLow], r.num(t, "t_low"), what)
	}
	all := accuracy{errs: append(append([]float64(nil), high.errs...), low.errs...)}
	if p := all.percentile(0.9); p > 0.001 {
		t.Errorf("90 %% of the values should lie within 0.1 %%, they lie within %.3f %%", 100*p)
	}
	return []*accuracy{high, low}
}

func motorTable(t *testing.T) []*accuracy {
	current, speed := &accuracy{name: "motor.csv current", bound: 0.002}, &accuracy{name: "motor.csv speed", bound: 0.002}
	voltage := &accuracy{name: "motor.csv voltage", bound: 0.005}
	for i, r := range table(t, "motor.csv") {
		period, duty := r.num(t, "period"), r.num(t, "duty")
		c := cycle{on: duty * period, off: (1 - duty) * period, r: r.num(t, "r"), l: r.num(t, "l")}
		c.sources[driven] = source{v: r.num(t, "v_on")}
		c.sources[free] = source{v: -r.num(t, "v_freewheel")}
		l := load{r: c.r, l: c.l, k: r.num(t, "k"), coulomb: r.num(t, "t_coulomb"), viscous: r.num(t, "b_viscous")}
		emf, w := l.balance(&c)
		what := fmt.Sprintf("row %d", i+1)
		current.add(t, w.current(), r.num(t, "i_avg"), what)
		speed.add(t, emf/l.k, r.num(t, "speed"), what)
		voltage.add(t, w.voltage(), r.num(t, "v_avg"), what)
	}
	return []*accuracy{current, speed, voltage}
}

// tableBoard is a row of board.csv: output 0.6 V and 6 ohm below the supply, 10 ohm
// above ground; a 2N2222-class transistor; a 1N4001 across the motor.
func tableBoard(t *testing.T, r record) (sweeps.Board, Setting) {
	diode := tableDiodes["1N4148"]
	b := bareBoard(sweeps.Timing{
		Network: sweeps.Steered, Charge: fixedR(r.num(t, "r1")), Discharge: fixedR(r.num(t, "r2")),
		Capacitor: si.Exactly(si.Farads(r.num(t, "c"))), ChargeDiode: diode, DischargeDiode: diode,
	})
	dischargePin(&b, 15)
	row := func(i, v float64) sweeps.CurrentVoltage {
		return sweeps.CurrentVoltage{Current: si.Amperes(i), Voltage: si.Volts(v)}
	}
	b.Timer.Drop = []sweeps.CurrentVoltage{row(0, 0.6), row(0.2, 1.8)}
	b.Timer.Low = []sweeps.CurrentVoltage{row(0, 0), row(0.2, 2)}
	rb := ohms(r.num(t, "rb"))
	b.Driver = sweeps.Driver{Stage: sweeps.StageNPN, Part: sweeps.Transistor{Name: "2N2222"}, BaseResistor: &rb, Flyback: sweeps.Diode{Name: "1N4001"}}
	b.Load = sweeps.Load{
		Kind: sweeps.Motor, Resistance: ohms(r.num(t, "r")), Inductance: si.Exactly(si.Henries(r.num(t, "l"))),
	}
	for text, into := range map[string]interface{ UnmarshalText([]byte) error }{
		r["k"] + " V s/rad": &b.Load.TorqueConstant, r["t_coulomb"] + " N m": &b.Load.CoulombTorque, r["b_viscous"] + " N m s": &b.Load.ViscousTorque,
	} {
		if err := into.UnmarshalText([]byte(text)); err != nil {
			t.Fatal(err)
		}
	}
	return b, Setting{Supply: r.num(t, "vcc"), Temperature: Reference}
}

func boardTable(t *testing.T) (all []*accuracy) {
	for _, q := range []struct {
		column string
		name   sweeps.Quantity
		bound  float64
		o      Options
	}{
		{"duty", sweeps.Duty, 0.005, Options{}}, {"frequency", sweeps.Frequency, 0.005, Options{}},
		{"motor_current", sweeps.MotorCurrent, 0.015, Options{}}, {"motor_voltage", sweeps.AverageVoltage, 0.015, Options{}},
		{"speed", sweeps.Speed, 0.015, Options{}}, {"supply_current", sweeps.SupplyCurrent, 0.015, Options{}},
		{"output_average", sweeps.AverageVoltage, 0.015, Options{Average: instruments.Between{instruments.NodeTimerOut, instruments.NodeCommon}}},
	} {
		a := &accuracy{name: "board.csv " + q.column, bound: q.bound}
		all = append(all, a)
		for i, r := range table(t, "board.csv") {
			b, s := tableBoard(t, r)
			v := mustAt(t, mustNew(t, b, q.o), s)
			a.add(t, v[q.name], r.num(t, q.column), fmt.Sprintf("row %d", i+1))
		}
	}
	return all
}
