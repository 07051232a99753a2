package predict

import (
	"fmt"
	"math"

	"nightbench/instruments/si"
)

// parts is one value of every part of a board, plain SI. It holds no pointers:
// a copy is a board of its own, and ten thousand of them are drawn at once.
type parts struct {
	charge, discharge, common, track float64 // Ω; of the resistor that is the bench's pot: unused
	stop, stopUp, stopDown, wiper    float64 // Ω
	pot                              float64 // what the pot really has over what it is said to have
	capacitor                        float64
	leak                             float64 // Ω across the capacitor, 0: none

	timer                           timer
	chargeDiode, dischargeDiode, fb diode
	switchPart                      transistor
	load                            load
}

// timer is the chip's own figures.
type timer struct {
	threshold, triggerRatio            float64 // fraction of the supply; trigger over threshold
	controlResistance                  float64
	triggerCurrent, thresholdCurrent   float64 // out of pin 2; into pin 6
	leakage                            float64 // into pin 7 when off
	offset, resistance                 float64 // discharge pin when on
	delay, edge                        float64
	dropScale, lowScale, quiescentRate float64
	dropShift                          float64 // V, from temperature
}

// diode is is·(exp(u/nvt) − 1) with rs in series and shunt across. is = 0: none fitted.
type diode struct{ is, n, rs, shunt, eg, xti, nvt float64 }

// transistor is a switch: bipolar by the Ebers–Moll law, MOS by scaled on-resistance rows.
type transistor struct {
	base                         float64 // Ω, base or gate resistor
	vbe, baseR                   float64
	vceSat, satR, betaF, betaR   float64
	hfeMin, storage, breakdown   float64
	vgsTh, rdsScale, vt, rdsHeat float64
}

// load is a winding with what turns on it, or a resistor (k = 0).
type load struct {
	r, l, k                        float64
	static, coulomb, viscous, quad float64
	brush, inertia                 float64
}

// Part is one figure of the board that may differ from specimen to specimen.
type Part struct {
	Name    string  `json:"name"` // "capacitor", "charge_diode.is"
	Nominal float64 `json:"nominal"`
	Low     float64 `json:"low"` // limits of its tolerance
	High    float64 `json:"high"`
	Unit    si.Unit `json:"unit"`
}

// variable is a Part with where it lives and how it is drawn.
type variable struct {
	name string
	unit si.Unit
	spread
	at func(*parts) *float64
}

// toleranced is any si value with a tolerance.
type toleranced interface {
	Spread() (nominal, tolerance float64, normal bool)
}

func spreadOf(t toleranced) spread { return tolerance(t.Spread()) }

// vary adds a variable and sets the nominal part to its typical value.
func (m *Model) vary(name string, unit si.Unit, s spread, at func(*parts) *float64) {
	*at(&m.nominal) = s.typical
	m.variables = append(m.variables, variable{name, unit, s, at})
}

// Parts lists what varies from specimen to specimen, in a fixed order.
func (m *Model) Parts() []Part {
	out := make([]Part, len(m.variables))
	for i, v := range m.variables {
		out[i] = Part{v.name, v.typical, v.low, v.high, v.unit}
	}
	return out
}

// With returns a model in which the named parts have other values and everything
// else is as before; tolerances move along in proportion. Names are those of Parts.
func (m *Model) With(values map[string]float64) (*Model, error) {
	c := *m
	c.variables = append([]variable(nil), m.variables...)
	found := 0
	for i := range c.variables {
		v := &c.variables[i]
		x, ok := values[v.name]
		if !ok {
			continue
		}
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return nil, fmt.Errorf("part %s: %g is no value", v.name, x)
		}
		found++
		v.spread = v.moved(x)
		*v.at(&c.nominal) = x
	}
	if found < len(values) {
		return nil, fmt.Errorf("board %q: a part named in %v is not one that varies", m.board.Name, keys(values))
	}
	return &c, c.check()
}

// moved is the spread about another typical value, of the same relative width.
func (s spread) moved(x float64) spread {
	if s.typical == 0 {
		return spread{typical: x, low: x + s.low, high: x + s.high, shape: s.shape}
	}
	f := x / s.typical
	return spread{typical: x, low: s.low * f, high: s.high * f, shape: s.shape}
}
