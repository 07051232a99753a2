package predict

import (
	"math"

	"nightbench/sweeps"
)

// substrate is the forward voltage of the junction through which a bipolar output
// conducts when its load pulls it beyond a rail and no flyback diode is fitted, V.
const substrate = 0.7

// driver is the output stage at one setpoint: what the load's terminals see.
type driver struct {
	base    float64 // A into base, while high
	gate    float64 // V at the gate
	sources [states]source
}

// control solves what the timer's output gives the transistor, carrying extra amperes besides.
func (m *Model) control(p *parts, out *output, extra float64) (d driver) {
	switch m.board.Driver.Stage {
	case sweeps.StageNPN, sweeps.StageDarlington:
		q := &p.switchPart
		d.base = out.into(q.base+q.baseR, q.vbe, extra)
	case sweeps.StageNMOS:
		d.gate, _ = out.high(extra)
	}
	return d
}

// on tells whether the stage can turn on at all.
func (m *Model) on(p *parts, d *driver) bool {
	switch m.board.Driver.Stage {
	case sweeps.StageNone:
		return true
	case sweeps.StageNMOS:
		return d.gate > p.switchPart.vgsTh
	}
	return d.base > 0
}

// connect sets the sources, straightened at the mean currents while driven and while freewheeling.
func (m *Model) connect(d *driver, p *parts, c *conditions, out *output, iOn, iFree, extra, idle float64) {
	stage := m.board.Driver.Stage
	if stage == sweeps.StageNone {
		m.connectOutput(d, p, c, out, iOn, iFree, extra, idle)
		return
	}
	v, r := 0.0, 0.0
	if stage == sweeps.StageNMOS {
		r = m.onResistance(p, d.gate)
	} else {
		v, r = p.switchPart.saturation(iOn, d.base)
		v -= r * iOn
	}
	if !m.on(p, d) {
		v, r = c.supply, 0
	}
	d.sources[driven] = source{c.supply - v, r}
	d.sources[clamped] = d.sources[driven]
	d.sources[free] = source{c.supply - p.switchPart.breakdown, 0}
	if p.fb.is > 0 {
		d.sources[free] = p.fb.freewheel(iFree)
	}
}

// connectOutput is a load on the timer's own output, to ground or to the supply.
// A MOS output conducts both ways at its on-resistance; a bipolar one takes current
// backwards only through a junction, and brakes the winding through the other rail's side.
// extra is what the timing network adds to the output's current while driven, idle while not.
func (m *Model) connectOutput(d *driver, p *parts, c *conditions, out *output, iOn, iFree, extra, idle float64) {
	toGround := !m.board.Load.ToSupply
	v, r := out.level(toGround, iOn+extra)
	rest, rRest := out.level(!toGround, 0)
	if toGround {
		d.sources[driven], d.sources[braked] = source{v + r*iOn, r}, source{rest, rRest}
	} else {
		d.sources[driven], d.sources[braked] = source{c.supply - v + r*iOn, r}, source{c.supply - rest, rRest}
	}
	if out.pull > 0 { // the timing network's charge comes through the load
		v, _ := out.level(true, idle)
		d.sources[free] = source{c.supply - v, 0}
		return
	}
	if m.rated.timer.PushPull {
		d.sources[clamped], d.sources[free] = d.sources[driven], d.sources[braked]
		return
	}
	d.sources[clamped] = source{c.supply + substrate, 0}
	d.sources[free] = source{-substrate, 0}
	if p.fb.is > 0 {
		d.sources[free] = p.fb.freewheel(iFree)
	}
}

// freewheel is the diode across the load as a source, straightened at a current.
func (d *diode) freewheel(i float64) source {
	i = math.Max(i, 1e-9)
	v := d.nvt*math.Log1p(i/d.is) + d.rs*i
	r := d.nvt/(i+d.is) + d.rs
	return source{-(v - r*i), r}
}

// gain is what the collector can carry over the base: the typical gain where it is known, else the least.
func (q *transistor) gain() float64 {
	if q.betaF > 0 {
		return q.betaF
	}
	return q.hfeMin
}

// saturation is the collector–emitter voltage of a saturated transistor, and its
// slope: Ebers–Moll, V = Vt·ln[(1/αR + x/βR)/(1 − x/βF)] with x = Ic/Ib, plus
// resistance; a constant where only that is known.
func (q *transistor) saturation(i, base float64) (v, r float64) {
	v, r = q.vceSat+q.satR*i, q.satR
	if q.betaF == 0 || q.betaR == 0 || base <= 0 {
		return v, r
	}
	x := math.Min(i/base, 0.95*q.betaF)
	up, down := (1+q.betaR)/q.betaR+x/q.betaR, 1-x/q.betaF
	v += q.vt * math.Log(up/down)
	r += q.vt * (1/(q.betaR*up) + 1/(q.betaF*down)) / base
	return v, r
}

// onResistance is the MOSFET's at a gate voltage: the part's rows, and below the
// first of them the channel law r ∝ 1/(VGS − Vth).
func (m *Model) onResistance(p *parts, gate float64) float64 {
	q := &p.switchPart
	scale := q.rdsScale * q.rdsHeat
	rows := m.rds
	first, last := rows[0], rows[len(rows)-1]
	switch {
	case gate <= q.vgsTh:
		return math.Inf(1)
	case gate < first[0]:
		return scale * first[1] * math.Max(1, (first[0]-q.vgsTh)/(gate-q.vgsTh))
	case gate >= last[0]:
		return scale * last[1]
	}
	k := 1
	for rows[k][0] < gate {
		k++
	}
	f := (gate - rows[k-1][0]) / (rows[k][0] - rows[k-1][0])
	return scale * (rows[k-1][1] + f*(rows[k][1]-rows[k-1][1]))
}
