package sweeps

import (
	"fmt"
	"slices"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// trips checks that every trip can act, and doesn't act at once.
func (c *checker) trips() {
	for _, trip := range c.plan.Trips {
		t := c.f.Look("trip").Look(string(trip.Quantity))
		if want := c.unmeasurable(trip.Quantity); want != "" {
			t.Fail("", "nothing can watch this limit: "+want)
			continue
		}
		switch trip.Quantity {
		case MotorCurrent, SupplyCurrent:
			c.currentTrip(trip, t)
		case SupplyVoltage, AverageVoltage:
			c.voltageTrip(trip, t)
		}
	}
}

// currentTrip checks that the bench's own limits leave the trip something to do.
func (c *checker) currentTrip(trip Trip, t *userfile.Table) {
	if c.bench == nil {
		return
	}
	s := c.bench.Supply
	limit := si.Amperes(trip.Limit)
	switch {
	case trip.Limit > s.MaxCurrent:
		t.Fail("limit", fmt.Sprintf("%s is above what bench %q allows, %s (supply.max_current): the trip could never act; give less", limit, c.bench.Bench, si.Amperes(s.MaxCurrent)))
	case s.Fuse > 0 && trip.Limit > s.Fuse:
		t.Fail("limit", fmt.Sprintf("%s is above the fuse of bench %q, %s (supply.fuse), which would blow first; give less", limit, c.bench.Bench, si.Amperes(s.Fuse)))
	}
}

// voltageTrip checks that a voltage trip stands above the plan's voltages and below the instrument's own protection.
func (c *checker) voltageTrip(trip Trip, t *userfile.Table) {
	a, _ := c.axis(func(a Axis) bool { return a.Set == SetSupplyVoltage })
	if trip.Quantity == SupplyVoltage && a != nil && len(a.Values) > 0 {
		if high := slices.Max(a.Values); trip.Limit <= high {
			t.Fail("limit", fmt.Sprintf("%s is not above the plan's highest supply, %s: the run would trip at once", si.Volts(trip.Limit), si.Volts(high)))
			return
		}
	}
	if c.bench != nil && trip.Limit > c.bench.Supply.OverVoltage {
		t.Fail("limit", fmt.Sprintf("%s is above the over-voltage protection of bench %q, %s (supply.over_voltage), which acts first; give less",
			si.Volts(trip.Limit), c.bench.Bench, si.Volts(c.bench.Supply.OverVoltage)))
	}
}

// byMeter are the quantities that a meter reads, if the bench file puts one to it.
var byMeter = []Quantity{AverageVoltage, MotorCurrent, OutputCurrent, ControlVoltage}

// byScope are the quantities taken from a record of any switching node.
var byScope = []Quantity{Duty, Frequency, Period, THigh, TLow, HighLevel, LowLevel, Ripple, RiseTime, FallTime, Jitter, Overshoot}

// byScopeAtLoad are those for which a channel has to look at the load.
var byScopeAtLoad = []Quantity{OutputDrop, BackEMF, Conduction}

// ofMotor are the quantities that a board without a motor doesn't have.
var ofMotor = []Quantity{MotorCurrent, BackEMF, Conduction, Speed}

// unmeasurable says why a quantity can't be measured on this board and bench, or nothing.
func (c *checker) unmeasurable(q Quantity) string {
	switch {
	case slices.Contains(ofMotor, q) && c.board.Load.Kind == ResistorLoad:
		return fmt.Sprintf("%s: the load of %s is a resistor", q, c.boardName())
	case q == PotResistance && !c.board.Timing.UsesPot():
		return fmt.Sprintf("pot_resistance: %s has no pot", c.boardName())
	case q == PotResistance:
		return ""
	case q == SupplyVoltage, q == SupplyCurrent, q == SupplyPower:
		return ""
	case slices.Contains(byScope, q), slices.Contains(byScopeAtLoad, q):
		return c.unseen(q)
	case slices.Contains(byMeter, q):
		return c.unread(q)
	}
	return fmt.Sprintf("%s is not measured by any instrument that this version supports", q)
}

// unread says that no meter reads a quantity, or nothing.
func (c *checker) unread(q Quantity) string {
	if c.bench == nil || slices.ContainsFunc(c.bench.Meters, func(m instruments.MeterWiring) bool { return m.Reads == string(q) }) {
		return ""
	}
	return fmt.Sprintf("%s: no meter of bench %q reads it; add a [[meter]] with reads = %q to the bench file", q, c.bench.Bench, q)
}

// unseen says that no scope channel sees a quantity, or nothing.
func (c *checker) unseen(q Quantity) string {
	if c.bench == nil {
		return ""
	}
	if c.bench.Scope == nil {
		return fmt.Sprintf("%s needs a scope and bench %q has none; add [scope] to the bench file", q, c.bench.Bench)
	}
	nodes := []instruments.Node{instruments.NodeLoadLow}
	if !slices.Contains(byScopeAtLoad, q) {
		nodes = append(nodes, instruments.NodeTimerOut)
	} else if c.board.Driver.Stage == StageNone && !c.board.Load.ToSupply {
		nodes = []instruments.Node{instruments.NodeTimerOut} // the load stands between timer_out and common
	}
	for _, ch := range c.bench.Scope.Channels {
		if slices.Contains(nodes, ch.Between[0]) && ch.Between[1] == instruments.NodeCommon {
			return ""
		}
	}
	node := nodes[len(nodes)-1]
	return fmt.Sprintf("%s: no scope channel of bench %q is wired for it; add one with between = [%q, %q]", q, c.bench.Bench, node, instruments.NodeCommon)
}
