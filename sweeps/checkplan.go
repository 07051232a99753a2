package sweeps

import (
	"fmt"
	"path/filepath"
	"slices"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// maxSetpoints bounds a plan: at 10 s a setpoint this is more than a week.
const maxSetpoints = 100_000

// CheckPlan tells whether plan, board and bench go together: every voltage
// within the board's rating and the bench's limits, every setting reachable,
// every quantity measurable, every trip able to act. Mistakes are reported with
// their lines in the plan file. Without a bench (nil) only plan and board are
// compared. Stress of the parts is for the prediction to judge.
func CheckPlan(plan Plan, board Board, bench *instruments.Wiring) error {
	c := checker{plan: plan, board: board, bench: bench, f: userfile.Reopen(plan.Path, plan.Text)}
	c.supply()
	c.pot()
	c.warmUp()
	c.settle()
	c.quantities()
	c.trips()
	c.size()
	return c.f.Failed()
}

type checker struct {
	plan  Plan
	board Board
	bench *instruments.Wiring // nil: none to compare with
	f     *userfile.File
}

// axis is the first axis that satisfies is, with its table; nil where there is none.
func (c *checker) axis(is func(Axis) bool) (*Axis, *userfile.Table) {
	for i := range c.plan.Axes {
		if is(c.plan.Axes[i]) {
			return &c.plan.Axes[i], c.f.Look("axis", i)
		}
	}
	return nil, nil
}

// keyOf is the key that value i of n stands at.
func keyOf(t *userfile.Table, i, n int) string {
	switch {
	case t.Has("values"):
		return "values"
	case i == 0:
		return "from"
	case i == n-1:
		return "to"
	}
	return "points"
}

// supply checks every supply voltage.
func (c *checker) supply() {
	a, t := c.axis(func(a Axis) bool { return a.Set == SetSupplyVoltage })
	if a == nil {
		c.f.Fail("axis", `no axis sets supply_voltage; add one, if only with one value: set = "supply_voltage", values = ["9 V"]`)
		return
	}
	if len(a.Values) == 0 {
		t.Fail("values", "the list is empty; give at least one")
	}
	for i, v := range a.Values {
		if want := c.voltageWrong(v); want != "" {
			t.FailItem(keyOf(t, i, len(a.Values)), i, want)
			return
		}
	}
}

// voltageWrong says what is wrong with a supply voltage, or nothing.
func (c *checker) voltageWrong(v float64) string {
	low, high := c.board.RatedSupply[0].SI(), c.board.RatedSupply[1].SI()
	volts := si.Volts(v).String()
	switch {
	case v > high:
		return fmt.Sprintf("%s is above the highest rated supply of the board, %s (board.rated_supply in %s)", volts, si.Volts(high), c.boardName())
	case v < low:
		return fmt.Sprintf("%s is below the lowest rated supply of the board, %s (board.rated_supply in %s)", volts, si.Volts(low), c.boardName())
	case c.bench != nil && v > c.bench.Supply.MaxVoltage:
		return fmt.Sprintf("%s is above what bench %q allows, %s (supply.max_voltage)", volts, c.bench.Bench, si.Volts(c.bench.Supply.MaxVoltage))
	}
	return ""
}

func (c *checker) boardName() string { return filepath.Base(c.board.Path) }

// warmUp checks where the board is warmed up.
func (c *checker) warmUp() {
	wu := c.plan.WarmUp
	if wu == nil {
		return
	}
	t := c.f.Look("warm_up").Look("at")
	if want := c.voltageWrong(wu.At.Supply.SI()); want != "" {
		t.Fail("supply_voltage", want)
	}
	c.warmUpPot(wu.At, t)
	if c.plan.AtMost > 0 && wu.For >= c.plan.AtMost {
		c.f.Look("warm_up").Fail("for", fmt.Sprintf("is not shorter than the plan's at_most, %s: nothing would be measured", c.plan.AtMost))
	}
}

// size bounds the number of setpoints.
func (c *checker) size() {
	n := 1
	for _, a := range c.plan.Axes {
		n *= max(1, len(a.Values))
		if a.Direction == Both {
			n *= 2
		}
		if n > maxSetpoints {
			c.f.Fail("axis", fmt.Sprintf("the axes make more than %d setpoints; give fewer values", maxSetpoints))
			return
		}
	}
}

// settle checks that something can watch the settling.
func (c *checker) settle() {
	t := c.f.Look("settle")
	q := c.plan.Settle.Watch
	if !slices.Contains(byMeter, q) {
		t.Fail("watch", "settling is watched by a meter; use average_voltage, motor_current, output_current or control_voltage")
		return
	}
	if want := c.unmeasurable(q); want != "" {
		t.Fail("watch", want)
	}
}

// quantities checks that everything asked for can be measured.
func (c *checker) quantities() {
	t := c.f.Look("measure")
	for i, q := range c.plan.Measure.Quantities {
		if want := c.unmeasurable(q); want != "" {
			t.FailItem("quantities", i, want)
		}
	}
	if c.plan.Measure.KeepWaveform > 0 && c.bench != nil && c.bench.Scope == nil {
		t.Fail("keep_waveform", fmt.Sprintf(`bench %q has no scope; use "never", or add [scope] to the bench file`, c.bench.Bench))
	}
	for q := range c.plan.Accept {
		if !slices.Contains(c.plan.Measure.Quantities, q) {
			c.f.Look("accept").Fail(string(q), "this plan does not measure it; add it to measure.quantities, or leave the limit out")
		}
	}
}
