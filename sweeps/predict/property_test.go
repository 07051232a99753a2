package predict

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// walker integrates the node equations in time, step by step. It knows the
// schematic and Kirchhoff's laws, and none of the forms the package uses: at each
// capacitor voltage it searches the common node's voltage, and within that each diode's.
type walker struct {
	source, r float64 // behind the common node; discharge: the pin's, with R_A beside
	ra, vcc   float64 // 0: nothing from the supply
	ways      [2]walkerWay
	bias, c   float64
	leak      float64 // 1/Ω across the capacitor
	steps     float64 // to a phase
	above     float64 // V of the common node over the capacitor, last found: the next search begins there
}

type walkerWay struct {
	r       float64 // +Inf: absent
	d       diode   // is = 0: none
	towards bool    // the diode points towards the capacitor
}

// into is the current into the capacitor through a way with v volts across it.
func (w *walkerWay) into(v float64) float64 {
	switch {
	case math.IsInf(w.r, 1):
		return 0
	case w.d.is == 0:
		return v / w.r
	case !w.towards:
		return -w.through(-v)
	}
	return w.through(v)
}

// through solves u + (r + rs)·is·(e^(u/nvt) − 1) = v by Newton's method from the right.
func (w *walkerWay) through(v float64) float64 {
	nvt, r := w.d.nvt, w.r+w.d.rs
	u := math.Max(v, 0)
	if v > 0 {
		u = math.Min(v, nvt*math.Log1p(v/(r*w.d.is)))
	}
	for range 100 {
		e := math.Exp(u / nvt)
		step := (u + r*w.d.is*(e-1) - v) / (1 + r*w.d.is*e/nvt)
		u -= step
		if math.Abs(step) < 1e-15 {
			break
		}
	}
	return w.d.is * math.Expm1(u/nvt)
}

// current into the capacitor at v: what comes into the common node less what goes
// on to the capacitor is zero at its voltage n.
func (w *walker) current(v float64) float64 {
	excess := func(n float64) float64 {
		in := (w.source - n) / w.r
		if w.ra > 0 {
			in += (w.vcc - n) / w.ra
		}
		return in - w.ways[0].into(n-v) - w.ways[1].into(n-v)
	}
	n, ok := secant(excess, v+w.above, v+w.above+1e-5)
	if !ok {
		n = falsePosition(excess, math.Min(0, v)-1, math.Max(w.source, math.Max(v, w.vcc))+1)
	}
	w.above = n - v
	return w.ways[0].into(n-v) + w.ways[1].into(n-v) + w.bias - w.leak*v
}

// secant finds a zero near a and b, or says that it did not.
func secant(f func(float64) float64, a, b float64) (float64, bool) {
	fa, fb := f(a), f(b)
	for range 12 {
		if fa == fb {
			return b, math.Abs(fb) < 1e-15
		}
		a, b, fa = b, b-fb*(b-a)/(fb-fa), fb
		if fb = f(b); math.Abs(b-a) < 1e-13 || math.Abs(fb) < 1e-16 {
			return b, true
		}
	}
	return b, false
}

// falsePosition finds the zero of a falling function between lo and hi, after the Illinois manner.
func falsePosition(f func(float64) float64, lo, hi float64) float64 {
	flo, fhi := f(lo), f(hi)
	side := 0
	for range 200 {
		n := (flo*hi - fhi*lo) / (flo - fhi)
		fn := f(n)
		switch {
		case math.Abs(fn) < 1e-15 || hi-lo < 1e-14:
			return n
		case fn > 0:
			lo, flo = n, fn
			if side == 1 {
				fhi /= 2
			}
			side = 1
		default:
			hi, fhi = n, fn
			if side == -1 {
				flo /= 2
			}
			side = -1
		}
	}
	return (lo + hi) / 2
}

// step is one of four-stage Runge–Kutta.
func (w *walker) step(v, h float64) float64 {
	k1 := w.current(v) / w.c
	k2 := w.current(v+h/2*k1) / w.c
	k3 := w.current(v+h/2*k2) / w.c
	k4 := w.current(v+h*k3) / w.c
	return v + h/6*(k1+2*k2+2*k3+k4)
}

// until walks from a voltage to another and td on; false if it never arrives.
// A step is the given share of the way at the present current; the last is cut to the level.
func (w *walker) until(from, to, td float64) (t, v float64, ok bool) {
	v = from
	span := math.Abs(to - from)
	for range int(40 * w.steps) {
		i := w.current(v) / w.c
		if i*(to-from) <= 0 {
			return 0, v, false
		}
		h := span / math.Abs(i) / w.steps
		next := w.step(v, h)
		if (next-to)*(from-to) > 0 {
			v, t = next, t+h
			continue
		}
		for range 30 { // Newton on the step that just reaches the level
			next = w.step(v, h)
			h -= (next - to) / (w.current(next) / w.c)
			if math.Abs(next-to) < 1e-12 {
				break
			}
		}
		t += h
		for range 20 {
			if td > 0 {
				next = w.step(next, td/20)
			}
		}
		return t + td, next, true
	}
	return 0, v, false
}

// walk gives the times of the third and second phase, from the trigger level.
func walk(m *Model, s Setting, steps float64) (high, low float64, ok bool) {
	p := m.nominal
	m.warm(&p, reference)
	c := s.conditions()
	th, tr := m.thresholds(&p, &c)
	charge, discharge := walkers(m, &p, s)
	charge.steps, discharge.steps = steps, steps
	if p.leak > 0 {
		charge.leak, discharge.leak = 1/p.leak, 1/p.leak
	}
	_, top, ok := charge.until(tr, th, p.timer.delay)
	if !ok {
		return 0, 0, false
	}
	low, bottom, ok := discharge.until(top, tr, p.timer.delay)
	if !ok {
		return 0, 0, false
	}
	high, _, ok = charge.until(bottom, th, p.timer.delay)
	return high, low, ok
}

func walkers(m *Model, p *parts, s Setting) (charge, discharge walker) {
	t := &m.board.Timing
	bias := p.timer.triggerCurrent - p.timer.thresholdCurrent
	up := walkerWay{r: 0, d: p.chargeDiode, towards: true}
	down := walkerWay{r: p.discharge, d: p.dischargeDiode}
	w := 0.0
	switch t.Network {
	case sweeps.Plain:
		up.r = math.Inf(1)
	case sweeps.Wiper:
		w = p.wiper
		up.r, down.r = s.Pot*p.track+p.stopUp, (1-s.Pot)*p.track+p.stopDown
	case sweeps.OutputFed:
		up.r = p.charge
		if p.chargeDiode.is == 0 {
			up, down = walkerWay{r: math.Inf(1)}, walkerWay{r: 1e-3}
		}
		charge = walker{source: s.Supply - m.board.Timer.Drop[0].Voltage.SI(), r: p.common + 50, bias: bias, c: p.capacitor, ways: [2]walkerWay{up, down}}
		discharge = charge
		discharge.source, discharge.r = 0, p.common+30
		return charge, discharge
	}
	charge = walker{source: s.Supply, r: p.charge + w, bias: bias, c: p.capacitor, ways: [2]walkerWay{up, down}}
	discharge = charge
	discharge.source, discharge.r = p.timer.offset, p.timer.resistance
	discharge.ra, discharge.vcc = p.charge, s.Supply
	if w > 0 { // the wiper's resistance lies behind the pin: fold pin and R_A into one source
		g := 1/p.timer.resistance + 1/p.charge
		discharge.source = (p.timer.offset/p.timer.resistance + s.Supply/p.charge) / g
		discharge.r, discharge.ra, discharge.vcc = 1/g+w, 0, 0
	}
	return charge, discharge
}

// randomBoard is any network with all the imperfections of a timer.
func randomBoard(r *rand.Rand, network sweeps.Network) (sweeps.Board, Setting, Options) {
	timing, share := randomTiming(r, network)
	b := bareBoard(timing)
	b.Load.Resistance = ohms(1e12)
	dischargePin(&b, between(r, 5, 40))
	b.Timer.DischargeOffset = &si.TolVoltage{Nominal: si.Volts(0.1 * r.Float64())}
	b.Timer.TriggerCurrent = &si.TolCurrent{Nominal: si.Amperes(2e-6 * r.Float64())}
	b.Timer.ThresholdCurrent = &si.TolCurrent{Nominal: si.Amperes(0.25e-6 * r.Float64())}
	if r.IntN(2) == 0 {
		b.Timer.Delay = &si.TolTime{Nominal: si.Seconds(0.5e-6 * r.Float64())}
	}
	straightOutput(&b, 0.1+2.4*r.Float64(), 50, 30)
	return b, Setting{Supply: 4.5 + 10.5*r.Float64(), Pot: share, Temperature: Reference}, Options{WiperResistance: 75}
}

// integratedBoards holds five hundred random boards, capacitors that leak among them, against the step-by-step walk.
func integratedBoards(t *testing.T) []*accuracy {
	r := rand.New(rand.NewPCG(11, 0))
	networks := []sweeps.Network{sweeps.Plain, sweeps.Bypassed, sweeps.Steered, sweeps.Wiper, sweeps.OutputFed}
	a, stopped := &accuracy{name: "integrated, any network, times", bound: 1e-5}, 0
	for n := range 500 {
		b, s, o := randomBoard(r, networks[n%5])
		m := mustNew(t, b, o)
		if r.IntN(3) == 0 {
			var err error
			if m, err = m.With(map[string]float64{"leak_resistance": between(r, 1e6, 1e8)}); err != nil {
				t.Fatal(err)
			}
		}
		res, err := m.At(s)
		if err != nil {
			t.Fatal(err)
		}
		var high, low float64
		var ok bool
		for steps := 25.0; steps < 5000; steps *= 5 { // where they differ, a finer walk decides whose error it is
			high, low, ok = walk(m, s, steps)
			off := math.Max(math.Abs(res.Values[sweeps.THigh]/high-1), math.Abs(res.Values[sweeps.TLow]/low-1))
			if ok == res.Oscillates && (!ok || off < a.bound) {
				break
			}
		}
		if ok != res.Oscillates {
			t.Fatalf("board %d, %s: oscillates %v, by integration %v", n, networks[n%5], res.Oscillates, ok)
		}
		if !ok {
			stopped++
			continue
		}
		what := fmt.Sprintf("board %d, %s: %+v", n, networks[n%5], m.nominal)
		a.add(t, res.Values[sweeps.THigh], high, what)
		a.add(t, res.Values[sweeps.TLow], low, what)
	}
	if stopped == 0 {
		t.Error("none of the boards stops: the agreement on that is not tested")
	}
	return []*accuracy{a}
}

// TestDoublingTheQuadrature: twice the nodes change no time by 1e-6.
func TestDoublingTheQuadrature(t *testing.T) {
	r := rand.New(rand.NewPCG(12, 0))
	networks := []sweeps.Network{sweeps.Plain, sweeps.Bypassed, sweeps.Steered, sweeps.Wiper, sweeps.OutputFed}
	worst := 0.0
	for n := range 500 {
		b, s, o := randomBoard(r, networks[n%5])
		once := mustNew(t, b, o)
		o.quadraturePoints = 2 * quadraturePoints
		x, err := once.At(s)
		if err != nil {
			t.Fatal(err)
		}
		y, err := mustNew(t, b, o).At(s)
		if err != nil {
			t.Fatal(err)
		}
		for _, q := range []sweeps.Quantity{sweeps.THigh, sweeps.TLow} {
			if !x.Oscillates {
				continue
			}
			e := math.Abs(x.Values[q]/y.Values[q] - 1)
			worst = math.Max(worst, e)
			if !(e < 1e-6) {
				t.Errorf("board %d, %s: %s changes by %.2g", n, networks[n%5], q, e)
			}
		}
	}
	t.Logf("worst change %.2g", worst)
}
