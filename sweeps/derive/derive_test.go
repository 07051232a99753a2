package derive_test

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/derive"
	"nightbench/sweeps/uncertainty"
)

// Every quantity against the truth it was made from, within its own uncertainty.
func TestAgainstTheTruth(t *testing.T) {
	for name, b := range map[string]*truth{"timer": onTimer(), "switched": switched()} {
		want := map[sweeps.Quantity]float64{
			sweeps.Duty: b.duty, sweeps.Period: b.period, sweeps.Frequency: 1 / b.period, sweeps.THigh: b.duty * b.period, sweeps.TLow: (1 - b.duty) * b.period,
			sweeps.AverageVoltage: b.average(), sweeps.SupplyVoltage: b.supply, sweeps.SupplyCurrent: b.current, sweeps.SupplyPower: b.supply * b.current,
		}
		if name == "timer" {
			want[sweeps.OutputDrop], want[sweeps.HighLevel], want[sweeps.LowLevel] = b.drop, b.high(), b.low
		} else {
			want[sweeps.OutputDrop], want[sweeps.MotorCurrent] = b.drop+0.3*b.current, b.current // the meter's burden counts
		}
		for q, x := range want {
			r := b.read(t, q)
			if r.Value == nil || math.Abs(*r.Value-x) > 2**r.U+1e-12*math.Abs(x) {
				t.Errorf("%s: %s is %v(%v) by %s, in truth %g; %+v", name, q, deref(r.Value), deref(r.U), r.Road, x, r.Flags)
			}
			if len(r.Flags) > 0 {
				t.Errorf("%s: %s is flagged %+v", name, q, r.Flags)
			}
		}
	}
}

func deref(x *float64) float64 {
	if x == nil {
		return math.NaN()
	}
	return *x
}

// The uncertainty by hand: gain, zero and resolution are rectangular (GUM 4.3.7,
// F.2.2.1), scatter is s/√n (GUM 4.2.3), the aperture term ΔV·D(1−D)·T/Ta over √n.
func TestAverageUncertaintyByHand(t *testing.T) {
	b := onTimer()
	b.accuracy = instruments.Accuracy{Reading: 1e-3, Range: 2e-4, Resolution: 1e-3}
	raw := b.raw()
	for i, d := range []float64{-2e-3, 1e-3, 0, 2e-3, -1e-3} { // s = √2.5 mV
		raw.Meters[0][i].Value += d
	}
	r := derive.Readings(b.wiring, b.board, raw, []sweeps.Quantity{sweeps.AverageVoltage})[0]
	beat := b.supply * b.duty * (1 - b.duty) * b.period / aperture / math.Sqrt(5)
	want := math.Sqrt(sq(math.Sqrt(2.5e-6/5)) + (sq(1e-3*b.average())+sq(2e-4*10)+sq(beat))/3 + 1e-6/12)
	if math.Abs(*r.U-want) > 1e-3*want || math.Abs(*r.Value-b.average()) > 1e-9 || r.Road != "meter average" {
		t.Errorf("%g(%g) by %s; want %g(%g)", *r.Value, *r.U, r.Road, b.average(), want)
	}
	if len(r.Raw) != 5 || r.Raw[0] != raw.Meters[0][0].Raw {
		t.Errorf("raw replies beside: %q", r.Raw)
	}
}

func sq(x float64) float64 { return x * x }

// Ten times the meter's limit of error, ten times u, as long as it is what counts.
func TestUFollowsTheMetersAccuracy(t *testing.T) {
	fine, coarse := onTimer(), onTimer()
	fine.period, coarse.period = 1e-5, 1e-5 // the aperture term is out of the way
	fine.accuracy = instruments.Accuracy{Reading: 0.5e-3, Range: 1e-4}
	coarse.accuracy = instruments.Accuracy{Reading: 5e-3, Range: 1e-3}
	a, b := fine.read(t, sweeps.AverageVoltage), coarse.read(t, sweeps.AverageVoltage)
	if ratio := *b.U / *a.U; math.Abs(ratio-10) > 0.01 {
		t.Errorf("u went from %g to %g V, by %.3f", *a.U, *b.U, ratio)
	}
	// The bench file's figure overrides the dialect's, and follows alike.
	fine.wiring.Meters[0].Accuracy = &instruments.Accuracy{Reading: 5e-3, Range: 1e-3}
	if c := fine.read(t, sweeps.AverageVoltage); math.Abs(*c.U / *b.U - 1) > 1e-6 {
		t.Errorf("by the bench file u is %g V, by the dialect %g V", *c.U, *b.U)
	}
}

// The drop by both roads: neither alone resolves it, their mean does, since the
// scope's zero cancels in it: drop = supply − average − (1 − D)·(amplitude) at the best.
func TestDropByBothRoads(t *testing.T) {
	b := onTimer()
	r := b.read(t, sweeps.OutputDrop)
	if !strings.Contains(r.Road, "average ÷ duty with scope ch 1, driven level") || math.Abs(*r.Value-b.drop) > 2**r.U {
		t.Errorf("%g(%g) by %s, in truth %g", *r.Value, *r.U, r.Road, b.drop)
	}
	// By hand: the scope's gain of 2 % on the amplitude's share, rectangular; at most.
	if most := (1 - b.duty) * (b.high() - b.low) * 0.02 / math.Sqrt(3) * 1.1; *r.U > most {
		t.Errorf("u %g V, by hand at most %g V", *r.U, most)
	}
	b.duty = 0.97 // hardly any low phase: the average says it all
	r = b.read(t, sweeps.OutputDrop)
	supply := math.Hypot((5e-4*9+5e-3)/math.Sqrt(3), 1e-3/math.Sqrt(12))
	if *r.U > 2*supply || math.Abs(*r.Value-b.drop) > 2**r.U {
		t.Errorf("%g(%g) by %s; the supply's own reading has %g", *r.Value, *r.U, r.Road, supply)
	}
	b.accuracy = instruments.Accuracy{Range: 0.5} // a meter of no use
	r = b.read(t, sweeps.OutputDrop)
	if !strings.Contains(r.Road, "driven level") || math.Abs(*r.Value-b.drop) > 2**r.U {
		t.Errorf("%g(%g) by %s", *r.Value, *r.U, r.Road)
	}
	b = onTimer()
	b.probe = 1.2 // the scope's volts are wrong: the two roads part, and that is said
	if _, ok := flag(b.read(t, sweeps.OutputDrop), "roads disagree"); !ok {
		t.Error("two roads that differ by far were averaged")
	}
}

// A switched motor has one road only: its average is no two-level wave's.
func TestDropOfASwitchedMotor(t *testing.T) {
	b := switched()
	r := b.read(t, sweeps.OutputDrop)
	if !strings.Contains(r.Road, "scope ch 2, driven level") {
		t.Errorf("by %q", r.Road)
	}
	if math.Abs(*r.Value-(b.drop+0.3*b.current)) > 0.02 {
		t.Errorf("%g V; %g V at the transistor, %g V at the meter", *r.Value, b.drop, 0.3*b.current)
	}
}

// What stands against the supply has the supply's uncertainty, what is seen by itself has not.
func TestScopeAverageAgainstTheSupply(t *testing.T) {
	b := switched()
	b.accuracy = instruments.Accuracy{Range: 1} // 10 V: the scope is the better road
	r := b.read(t, sweeps.AverageVoltage)
	if r.Road != "scope ch 2" || math.Abs(*r.Value-b.average()) > 2**r.U {
		t.Errorf("%g(%g) by %s, in truth %g", *r.Value, *r.U, r.Road, b.average())
	}
	raw := b.raw()
	for i := range raw.Supply {
		raw.Supply[i].Voltage.Accuracy.Offset = 3 // volts
	}
	wide := derive.Readings(b.wiring, b.board, raw, []sweeps.Quantity{sweeps.AverageVoltage, sweeps.OutputDrop})
	if *wide[0].U < 3/math.Sqrt(3) {
		t.Errorf("u is %g V, though the supply is known to 3 V", *wide[0].U)
	}
	if *wide[1].U > 0.5 {
		t.Errorf("u of the drop is %g V, though the supply cancels in it", *wide[1].U)
	}
}

// Every flag, provoked; its words name the likely cause.
func TestFlags(t *testing.T) {
	for _, c := range []struct {
		name   string
		of     sweeps.Quantity
		make   func() *truth
		flag   string
		words  string
		absent bool // no value
	}{
		{"overload", sweeps.AverageVoltage, func() *truth { b := onTimer(); b.overload = true; b.wiring.Scope = nil; return b }, "overload", "range of 10", true},
		{"probe ×10 too much", sweeps.AverageVoltage, func() *truth { b := onTimer(); b.probe = 0.1; return b }, "roads disagree", "probe factor", false},
		{"probe ×10, switched", sweeps.AverageVoltage, func() *truth { b := switched(); b.probe = 0.1; return b }, "roads disagree", "probe factor", false},
		{"AC coupling", sweeps.AverageVoltage, func() *truth { b := onTimer(); b.ac = true; return b }, "roads disagree", "AC coupling", false},
		{"AC coupling, switched", sweeps.AverageVoltage, func() *truth { b := switched(); b.ac = true; return b }, "roads disagree", "AC coupling", false},
		{"no scope", sweeps.Duty, func() *truth { b := onTimer(); b.wiring.Scope = nil; return b }, "no road", "timer_out", true},
		{"no meter", sweeps.MotorCurrent, onTimer, "no road", "motor_current", true},
		{"no pot", sweeps.PotResistance, onTimer, "no road", "no pot", true},
		{"standing still", sweeps.Duty, func() *truth { b := onTimer(); b.drop, b.low, b.noise = 0.4, 8.6, 0; return b }, "constant high", "has no duty", true},
		{"loading", sweeps.AverageVoltage, func() *truth {
			b := onTimer()
			b.wiring.Meters[0].InputResistance = 1e6
			b.board.Load.Resistance = si.Exactly(si.Ohms(10e3))
			return b
		}, "meter loads", "1.0 %", false},
		{"clipped", sweeps.HighLevel, func() *truth { b := onTimer(); b.drop = -2.5; return b }, "clipped", "", false},
	} {
		r := c.make().read(t, c.of)
		f, ok := flag(r, c.flag)
		if !ok || !strings.Contains(f.Words, c.words) {
			t.Errorf("%s: %v(%v), flags %+v; want %q with %q", c.name, deref(r.Value), deref(r.U), r.Flags, c.flag, c.words)
		}
		if c.absent != (r.Value == nil) {
			t.Errorf("%s: value %v", c.name, deref(r.Value))
		}
	}
}

// Replies that are no number never become one.
func TestNoNumberIsNoValue(t *testing.T) {
	for _, o := range []instruments.Outcome{instruments.Overload, instruments.NotANumber, instruments.NoMeasurement} {
		b := onTimer()
		raw := b.raw()
		raw.Meters[0][3].Outcome, raw.Meters[0][3].Value = o, math.NaN()
		raw.Supply[1].Current.Outcome = o
		r := derive.Readings(b.wiring, b.board, raw, []sweeps.Quantity{sweeps.AverageVoltage, sweeps.SupplyCurrent, sweeps.SupplyPower})
		if r[0].Road != "scope ch 1" { // the other road is left
			t.Errorf("%s: the average came by %q", o, r[0].Road)
		}
		for _, x := range r[1:] {
			if _, ok := flag(x, string(o)); x.Value != nil || !ok {
				t.Errorf("%s: %s is %v, %+v", o, x.Quantity, deref(x.Value), x.Flags)
			}
		}
	}
}

// Nothing measured at all: every quantity says so, none has a value, nothing panics.
func TestNothingMeasured(t *testing.T) {
	for _, b := range []*truth{onTimer(), switched()} {
		var all []sweeps.Quantity
		for _, q := range sweeps.Quantities {
			all = append(all, q.Name)
		}
		for _, r := range derive.Readings(b.wiring, b.board, derive.Raw{}, all) {
			if r.Value != nil || len(r.Flags) == 0 {
				t.Errorf("%s: %v, %+v", r.Quantity, deref(r.Value), r.Flags)
			}
		}
	}
}

// Derivation is pure: the same raw data give the same readings, and are left as they were.
func TestPure(t *testing.T) {
	b := switched()
	b.rng = rand.New(rand.NewPCG(1, 2))
	raw := b.raw()
	wanted := []sweeps.Quantity{sweeps.Duty, sweeps.AverageVoltage, sweeps.OutputDrop, sweeps.HighLevel, sweeps.MotorCurrent}
	a, c := derive.Readings(b.wiring, b.board, raw, wanted), derive.Readings(b.wiring, b.board, raw, wanted)
	for i := range a {
		if *a[i].Value != *c[i].Value || *a[i].U != *c[i].U || len(a[i].Flags) != len(c[i].Flags) {
			t.Errorf("%s: %+v and then %+v", a[i].Quantity, a[i], c[i])
		}
	}
}

// Intervals of 95 % cover the truth in 93 to 97 % of seeded repeats.
func TestCoverage(t *testing.T) {
	const trials = 500 // one standard deviation of the share is then 1 %
	b := onTimer()
	b.rng = rand.New(rand.NewPCG(7, 11))
	b.accuracy, b.scatter = instruments.Accuracy{Reading: 5e-4, Range: 1e-4}, 2e-3
	b.edge = 1e-6    // faster than a sample: its instant is known to Δt/√12
	b.period = 20e-6 // the aperture term is then small, as a meter in step would have it
	hits := map[sweeps.Quantity]int{}
	for range trials {
		raw := b.raw()
		for _, r := range derive.Readings(b.wiring, b.board, raw, []sweeps.Quantity{sweeps.AverageVoltage, sweeps.Duty}) {
			dof := math.Inf(1)
			if r.DOF != nil {
				dof = *r.DOF
			}
			low, high := uncertainty.Value{X: *r.Value, U: *r.U, DOF: dof}.Interval(0.95)
			want := map[sweeps.Quantity]float64{sweeps.AverageVoltage: b.average(), sweeps.Duty: b.duty}[r.Quantity]
			if low <= want && want <= high {
				hits[r.Quantity]++
			}
		}
	}
	for _, q := range []sweeps.Quantity{sweeps.AverageVoltage, sweeps.Duty} {
		share := float64(hits[q]) / trials
		t.Logf("%s: %.1f %% of %d", q, 100*share, trials)
		if share < 0.93 || share > 0.97 {
			t.Errorf("%s: the interval of 95 %% covers %.1f %%", q, 100*share)
		}
	}
}
