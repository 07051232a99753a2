package circuit

import "math"

// Nominal is the temperature at which part figures hold, in kelvin (27 °C).
const Nominal = 300.15

// boltzmannOverCharge is k/q in V/K (exact SI constants of 2019).
const boltzmannOverCharge = 8.617333262e-5

// A Diode is Knee + N Vt ln(1 + i/Is) + Rs i, with an optional shunt across
// the junction. With Is zero it is ideal: a constant knee and a resistance.
type Diode struct {
	Is   float64 // saturation current at 27 °C, A
	N    float64 // emission coefficient
	Rs   float64 // series resistance, ohm
	Rsh  float64 // leakage shunt across the junction, ohm; 0 means none
	Knee float64 // constant part of the drop, V; usual only with Is = 0
	Eg   float64 // band gap for Is(T), eV; 0 means 1.11 (silicon); Schottky 0.69
	Xti  float64 // exponent for Is(T); 0 means 3 (silicon); Schottky 2
}

// isAt gives Is at temperature t by the usual law,
// Is (T/T0)^(Xti/N) exp((T/T0 − 1) Eg/(N Vt)).
func (d *Diode) isAt(t float64) float64 {
	if t == Nominal || d.Is == 0 {
		return d.Is
	}
	eg, xti := d.Eg, d.Xti
	if eg == 0 {
		eg = 1.11
	}
	if xti == 0 {
		xti = 3
	}
	r := t / Nominal
	return d.Is * math.Exp(xti/d.N*math.Log(r)+(r-1)*eg/(d.N*boltzmannOverCharge*t))
}

// A forward is a diode at one temperature, seen as a voltage for a current.
type forward struct{ knee, is, nvt, rs float64 }

func (d *Diode) forward(t float64) forward {
	return forward{d.Knee, d.isAt(t), d.N * boltzmannOverCharge * t, d.Rs}
}

// drop gives the voltage at forward current i ≥ 0 and its derivative.
func (f forward) drop(i float64) (v, r float64) {
	v, r = f.knee+f.rs*i, f.rs
	if f.is > 0 {
		v += f.nvt * math.Log1p(i/f.is)
		r += f.nvt / (i + f.is)
	}
	return v, r
}

// A branch joins the network's node W to the capacitor: nothing, a resistor,
// or a diode with a resistor in series. u is its junction voltage, kept from
// one solution to the next as the first guess.
type branch struct {
	kind          branchKind
	r, is, nvt, g float64 // series ohm, A, V, shunt siemens
	vcrit         float64
	u             float64
	e             float64 // exp(u/nvt)
}

// wiring is the resistance no joint goes below, ohm.
const wiring = 1e-3

type branchKind uint8

const (
	open branchKind = iota
	resistive
	junction
)

func (b *branch) set(d *Diode, series, t float64) {
	if d == nil {
		b.kind, b.r = resistive, math.Max(series, wiring)
		return
	}
	b.kind, b.r = junction, series+d.Rs
	b.is, b.nvt, b.g = d.isAt(t), d.N*boltzmannOverCharge*t, 0
	if d.Rsh > 0 {
		b.g = 1 / d.Rsh
	}
	b.vcrit = b.nvt * math.Log(b.nvt/(math.Sqrt2*b.is))
}

// linear gives the branch as a + G V around the present junction voltage.
func (b *branch) linear() (a, g float64) {
	switch b.kind {
	case open:
		return 0, 0
	case resistive:
		return 0, 1 / b.r
	}
	e := math.Exp(b.u / b.nvt)
	b.e = e
	i := b.is*(e-1) + b.g*b.u
	gj := b.is*e/b.nvt + b.g
	g = gj / (1 + b.r*gj)
	return i - g*(b.u+b.r*i), g
}

// move takes the junction to where the linearisation says it is for branch
// voltage v, held back where the exponential would run away, and returns how
// far it went in units of N Vt.
func (b *branch) move(v float64) float64 {
	if b.kind != junction {
		return 0
	}
	i := b.is*(b.e-1) + b.g*b.u
	gj := b.is*b.e/b.nvt + b.g
	u := b.u + (v-b.u-b.r*i)/(1+b.r*gj)
	if d := u - b.u; u > b.vcrit && d > 2*b.nvt {
		if b.u > 0 {
			u = b.u + b.nvt*math.Log1p(d/b.nvt)
		} else {
			u = b.vcrit
		}
	}
	step := math.Abs(u-b.u) / b.nvt
	b.u = u
	return step
}
