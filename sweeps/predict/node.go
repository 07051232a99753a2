package predict

import (
	"fmt"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// loadTerminals is where average_voltage is taken unless a bench's meter is wired elsewhere.
var loadTerminals = instruments.Between{instruments.NodeLoadHigh, instruments.NodeLoadLow}

// checkAverage refuses nodes whose mean the laws do not give.
func checkAverage(b instruments.Between) error {
	for _, n := range b {
		switch n {
		case instruments.NodeSupply, instruments.NodeBoard, instruments.NodeFlybackTop, instruments.NodeLoadHigh, instruments.NodeLoadLow,
			instruments.NodeTimerOut, instruments.NodeControl, instruments.NodeCommon, instruments.NodeEarth:
		default:
			return fmt.Errorf("average_voltage between %s and %s: the mean voltage of %q is not predicted; wire the meter to supply, flyback_top, load_hi, load_lo, timer_out, control or common", b[0], b[1], n)
		}
	}
	return nil
}

// mean is the average voltage of a node over the period, above common.
func (m *Model) mean(o *outcome, c *conditions, n instruments.Node) float64 {
	i, v := o.wave.current(), o.wave.voltage()
	toGround := m.board.Driver.Stage == sweeps.StageNone && !m.board.Load.ToSupply
	top := c.supply
	if toGround {
		top = v + c.burden*i
	}
	switch n {
	case instruments.NodeSupply, instruments.NodeBoard:
		return c.supply
	case instruments.NodeFlybackTop:
		return top
	case instruments.NodeLoadHigh:
		return top - c.burden*i
	case instruments.NodeLoadLow:
		return top - c.burden*i - v
	case instruments.NodeControl:
		return o.threshold
	case instruments.NodeTimerOut:
		switch {
		case toGround:
			return top
		case m.board.Driver.Stage == sweeps.StageNone:
			return top - c.burden*i - v
		}
		return (o.highLevel*o.high + o.lowLevel*o.low) / (o.high + o.low)
	}
	return 0
}
