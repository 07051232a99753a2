package predict

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// stageCase is a driver stage and where its load goes.
type stageCase struct {
	stage    sweeps.Stage
	toSupply bool
	fed      bool // the timing network hangs on the same output
}

// read sets quantities from text, as a board file would.
func read(t testing.TB, pairs map[string]interface{ UnmarshalText([]byte) error }) {
	t.Helper()
	for text, into := range pairs {
		if err := into.UnmarshalText([]byte(text)); err != nil {
			t.Fatal(err)
		}
	}
}

// randomStage draws a whole board: a steered network, an output with drop and
// resistance, the stage, and a resistor or a motor.
func randomStage(t *testing.T, r *rand.Rand, c stageCase, motor bool) sweeps.Board {
	b := bareBoard(timing(sweeps.Steered, between(r, 4.7e3, 22e3), between(r, 4.7e3, 22e3), between(r, 4.7e-9, 47e-9), tableDiodes["1N4148"]))
	b.Timer = sweeps.Timer{
		Part: "bipolar", TriggerCurrent: &si.TolCurrent{}, ThresholdCurrent: &si.TolCurrent{}, Delay: &si.TolTime{},
		DischargeOffset: &si.TolVoltage{}, Quiescent: &si.TolCurrent{},
	}
	dischargePin(&b, 15)
	straightOutput(&b, 1.2, 6, 10)
	if c.fed {
		b.Timing = timing(sweeps.OutputFed, between(r, 1e3, 10e3), between(r, 1e3, 10e3), between(r, 22e-9, 100e-9), tableDiodes["1N4148"])
		b.Timing.Common = fixedR(between(r, 100, 1e3))
	}
	b.Driver.Stage = c.stage
	b.Load.ToSupply = c.toSupply
	base := ohms(between(r, 330, 1e3))
	switch c.stage {
	case sweeps.StageNPN:
		b.Driver.Part, b.Driver.BaseResistor = sweeps.Transistor{Name: "2N2222"}, &base
	case sweeps.StageDarlington:
		base = ohms(between(r, 2.2e3, 10e3))
		b.Driver.Part, b.Driver.BaseResistor = sweeps.Transistor{VBE: 1.4, VCESat: 0.8, HFEMin: 5000}, &base // as a sheet states them at some 50 mA
	case sweeps.StageNMOS:
		b.Driver.Part = sweeps.Transistor{RdsOn: 0.05, VgsTh: 1.2}
	}
	b.Load.Resistance = ohms(between(r, 100, 1e3))
	if motor {
		b.Driver.Flyback = sweeps.Diode{Name: "1N4001"}
		randomMotor(t, r, &b, c.stage == sweeps.StageNone)
	}
	return b
}

// randomMotor draws a motor that runs at about half the supply; weak, for the timer's own output.
func randomMotor(t *testing.T, r *rand.Rand, b *sweeps.Board, weak bool) {
	b.Load.Kind = sweeps.Motor
	res, k, current := between(r, 3, 20), between(r, 3e-3, 12e-3), between(r, 0.02, 0.08)
	if weak {
		res, current = between(r, 40, 150), between(r, 0.004, 0.015)
	}
	b.Load.Resistance = ohms(res)
	read(t, map[string]interface{ UnmarshalText([]byte) error }{
		fmt.Sprintf("%g H", res*between(r, 3e-5, 4e-4)):      &b.Load.Inductance,
		fmt.Sprintf("%g V s/rad", k):                         &b.Load.TorqueConstant,
		fmt.Sprintf("%g N m", k*current):                     &b.Load.CoulombTorque,
		fmt.Sprintf("%g N m s", k*current/5000):              &b.Load.ViscousTorque,
		fmt.Sprintf("%g N m s2", k*current*1e-7*r.Float64()): &b.Load.QuadraticTorque,
	})
}

// bjt is the 2N2222-class card of the reference tables' README.
const bjt = ".model qn npn(is=1.4e-14 bf=220 vaf=74 ikf=0.3 rb=10 rc=0.3 re=0.2)"

// spiceStage writes the output, the stage and the load; va and vb are the load's terminals.
func spiceStage(d *deck, m *Model, s Setting, speed float64) {
	d.add("eh h1 0 h 0 1\nrh h1 hs 1k\nch hs 0 20p") // edges of 20 ns
	d.add("bh s o i=max(0,2*v(hs)-1)*max(0,%g-v(o))/6\nbl o 0 i=max(0,1-2*v(hs))*max(0,v(o))/10\nrl0 o 0 10meg\nco o 0 20p", s.Supply-1.2)
	p := &m.nominal
	va, vb := "s", "c"
	switch m.board.Driver.Stage {
	case sweeps.StageNone:
		va, vb = "o", "0"
		if m.board.Load.ToSupply {
			va, vb = "s", "o"
		}
	case sweeps.StageNPN:
		d.add(bjt+"\nrbb o bb %g\nq1 c bb 0 qn", p.switchPart.base)
	case sweeps.StageDarlington:
		d.add(bjt+"\nrbb o bb %g\nq1 c bb e qn\nq2 c e 0 qn\nree e 0 100k\nce e 0 20p\ncb bb 0 20p", p.switchPart.base)
	case sweeps.StageNMOS:
		d.add(".model nm nmos(level=1 vto=1.2 kp=%g)\nm1 c o 0 0 nm w=1 l=1", 1/(0.05*(4.5-1.2)))
	}
	l := &p.load
	d.add("vi %s lh 0", va)
	if l.k == 0 {
		d.add("rload lh %s %g", vb, l.r)
		d.add("bv vl 0 v=v(lh)-v(%s)", vb)
		return
	}
	d.add(".model df d(is=%g n=%g rs=%g)\ndf %s %s df\nrsn %s sn 1k\ncsn sn %s 200p\ncp %s %s 20p", p.fb.is, p.fb.n, p.fb.rs, vb, va, va, vb, va, vb)
	d.add("rload lh m1 %g\nlload m1 m2 %g ic=0\nve m2 %s %g", l.r, l.l, vb, l.k*speed)
	d.add("bv vl 0 v=v(lh)-v(%s)", vb)
	if m.board.Driver.Stage == sweeps.StageNone { // the substrate junction towards the other rail
		anode, cathode := "o", "s"
		if m.board.Load.ToSupply {
			anode, cathode = "0", "o"
		}
		d.add(".model ds d(is=1e-14)\nds %s %s ds", anode, cathode)
	}
}

// simulatedStages simulates eight whole boards of each stage, half of them with motors.
func simulatedStages(t *testing.T) (all []*accuracy) {
	needSpice(t)
	for k, c := range []stageCase{
		{stage: sweeps.StageNone}, {stage: sweeps.StageNone, toSupply: true}, {stage: sweeps.StageNPN}, {stage: sweeps.StageDarlington}, {stage: sweeps.StageNMOS},
		{stage: sweeps.StageNone, fed: true}, {stage: sweeps.StageNone, toSupply: true, fed: true}, {stage: sweeps.StageNPN, fed: true},
	} {
		name := "simulated stage " + string(c.stage)
		if c.toSupply {
			name += " to supply"
		}
		if c.fed {
			name += ", output-fed"
		}
		high, low := &accuracy{name: name + ", t_high", bound: 0.005}, &accuracy{name: name + ", t_low", bound: 0.005}
		current, voltage, supply := &accuracy{name: name + ", load A", bound: 0.02}, &accuracy{name: name + ", load V", bound: 0.02}, &accuracy{name: name + ", supply A", bound: 0.02}
		r := rand.New(rand.NewPCG(uint64(k), 7))
		for n := range 8 {
			motor := n%2 == 1 && !(c.fed && c.stage == sweeps.StageNone) // a winding on a shared output is flagged instead
			m := mustNew(t, randomStage(t, r, c, motor), Options{})
			s := Setting{Supply: []float64{5, 9, 12, 15}[r.IntN(4)], Temperature: Reference}
			v := mustAt(t, m, s)
			if motor && v[sweeps.Speed] == 0 {
				t.Fatalf("case %d stands still", n)
			}
			got := balanced(t, m, s, v)
			what := fmt.Sprintf("case %d at %g V, duty %.2f, load %+v", n, s.Supply, v[sweeps.Duty], m.nominal.load)
			high.add(t, v[sweeps.THigh], got.high, what)
			low.add(t, v[sweeps.TLow], got.low, what)
			current.add(t, v[sweeps.MotorCurrent], got.current, what)
			voltage.add(t, v[sweeps.AverageVoltage], got.voltage, what)
			supply.add(t, v[sweeps.SupplyCurrent], got.supply, what)
		}
		all = append(all, high, low, current, voltage, supply)
	}
	return all
}

// means are a simulated board's, over its last whole period.
type means struct{ current, voltage, supply, high, low float64 }

// simulateStage runs a board with its shaft held at a speed, for six electrical time constants at least.
func simulateStage(t *testing.T, m *Model, s Setting, v map[sweeps.Quantity]float64, speed float64) means {
	t.Helper()
	l := &m.nominal.load
	periods := 3.2 + math.Ceil(6*l.l/l.r/v[sweeps.Period])
	d := &deck{stop: periods * v[sweeps.Period], step: math.Min(v[sweeps.THigh], v[sweeps.TLow]) / 123.7, temperature: s.Temperature}
	spiceTiming(d, m, s)
	spiceStage(d, m, s, speed)
	tr := d.simulate(t, "v(h)", "i(vi)", "v(vl)", "i(vs)")
	up := tr.crossings("v(h)", 0.5, true)
	if len(up) < 3 {
		t.Fatalf("only %d periods simulated, predicted %v\n%s", len(up), v, strings.Join(d.lines, "\n"))
	}
	from, to := up[len(up)-2], up[len(up)-1] // the last whole period
	high, low := tr.rhythm(t)
	return means{tr.mean("i(vi)", from, to), tr.mean("v(vl)", from, to), -tr.mean("i(vs)", from, to), high, low}
}

// balanced is the simulated board at the speed where its mean torque equals
// friction: two speeds about the predicted one, and a straight line between.
func balanced(t *testing.T, m *Model, s Setting, v map[sweeps.Quantity]float64) means {
	t.Helper()
	l := &m.nominal.load
	if l.k == 0 {
		return simulateStage(t, m, s, v, 0)
	}
	excess := func(speed float64) (float64, means) {
		got := simulateStage(t, m, s, v, speed)
		return l.k*got.current - l.friction(speed), got
	}
	w := v[sweeps.Speed]
	fa, a := excess(0.99 * w)
	fb, b := excess(1.01 * w)
	f := fa / (fa - fb) // share of the way from a to b
	mix := func(x, y float64) float64 { return x + f*(y-x) }
	return means{mix(a.current, b.current), mix(a.voltage, b.voltage), mix(a.supply, b.supply), mix(a.high, b.high), mix(a.low, b.low)}
}
