package predict

import (
	"math"

	"nightbench/sweeps"
)

// nothing is a way that is not there.
var nothing = branch{r: math.Inf(1)}

// laws gives the charging and the discharging phase of the board's network
// (docs: the five networks, each a source, a common node and two ways to the capacitor).
// out is used by the output-fed network only, with the load's current in each phase.
func (m *Model) laws(p *parts, at *conditions, out *output, carriedHigh, carriedLow float64) (charge, discharge law) {
	up, down, rs := m.ways(p, at)
	otherUp, otherDown := up, down
	if up.nvt == 0 && down.nvt == 0 { // one resistance, both ways
		otherUp, otherDown = nothing, nothing
	}
	bias := p.timer.triggerCurrent - p.timer.thresholdCurrent
	leak := 0.0
	if p.leak > 0 {
		leak = 1 / p.leak
	}
	charge = law{sign: 1, on: up, other: otherDown, bias: bias, leak: leak, c: p.capacitor}
	discharge = law{sign: -1, on: down, other: otherUp, bias: bias, leak: leak, c: p.capacitor}
	if m.board.Timing.Network == sweeps.OutputFed {
		charge.r, discharge.r = rs.common, rs.common
		charge.output, discharge.output = out, out
		charge.carried, discharge.carried = carriedHigh, carriedLow
		return charge, discharge
	}
	ra, r7 := rs.charge, p.timer.resistance
	w := 0.0
	if m.board.Timing.Network == sweeps.Wiper {
		w = p.wiper
	}
	charge.source, charge.r = at.supply-ra*p.timer.leakage, ra+w
	discharge.source = (at.supply*r7 + p.timer.offset*ra) / (r7 + ra)
	discharge.r = r7*ra/(r7+ra) + w
	return charge, discharge
}

// ways are the two branches between the common node and the capacitor: up with
// the charging diode, down with the discharging one.
func (m *Model) ways(p *parts, at *conditions) (up, down branch, rs resistances) {
	rs = m.resistances(p, at)
	switch m.board.Timing.Network {
	case sweeps.Wiper:
		up = newBranch(rs.up, p.chargeDiode)
		down = newBranch(rs.down, p.dischargeDiode)
	case sweeps.OutputFed:
		up, down = newBranch(rs.charge, p.chargeDiode), newBranch(rs.discharge, p.dischargeDiode)
		if p.chargeDiode.is == 0 && p.dischargeDiode.is == 0 {
			one := parallel(rs.charge, rs.discharge)
			up = newBranch(one, diode{})
			down = up
		}
	case sweeps.Plain:
		up = newBranch(rs.discharge, diode{})
		down = up
	default:
		up, down = newBranch(0, p.chargeDiode), newBranch(rs.discharge, p.dischargeDiode)
	}
	return up, down, rs
}

// resistances are the network's, with the bench's pot in its place.
type resistances struct{ charge, discharge, common, up, down float64 }

func (m *Model) resistances(p *parts, at *conditions) resistances {
	t := &m.board.Timing
	rs := resistances{charge: p.charge, discharge: p.discharge, common: p.common}
	pot := at.pot*p.pot + p.stop
	switch {
	case t.Network == sweeps.Wiper:
		rs.up = at.pot*p.track + p.stopUp
		rs.down = (1-at.pot)*p.track + p.stopDown
	case t.Charge.Pot:
		rs.charge = pot
	case t.Discharge.Pot:
		rs.discharge = pot
	case t.Common.Pot:
		rs.common = pot
	}
	return rs
}

// parallel is two resistances side by side; zero where either is.
func parallel(a, b float64) float64 {
	if a == 0 || b == 0 {
		return 0
	}
	return a * b / (a + b)
}
