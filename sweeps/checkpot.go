package sweeps

import (
	"fmt"
	"slices"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// pot checks that the pot, where it is stepped, is there, reaches every setting and bears the voltage.
func (c *checker) pot() {
	a, t := c.axis(Axis.TurnsPot)
	uses := c.board.Timing.UsesPot()
	switch {
	case a == nil && uses:
		c.f.Fail("axis", `the board is timed by the pot and no axis says where it stands; add one, if only with one value: set = "pot_resistance", values = ["10k"]`)
	case a == nil:
	case !uses:
		t.Fail("set", fmt.Sprintf(`the board has no pot: no resistor in [timing] of %s is "pot"; leave this axis out`, c.boardName()))
	case c.board.Timing.Track.Pot:
		t.Fail("set", `a pot with its wiper in the timing network (network = "wiper") needs the axis pot_position, which is not supported yet by this version; use network = "steered"`)
	case c.bench != nil && c.bench.Pot == nil:
		t.Fail("set", fmt.Sprintf("bench %q has no pot; add [pot] to the bench file", c.bench.Bench))
	case c.bench != nil:
		c.potSettings(*a, t)
		c.potVoltage(t)
	}
}

// potSettings checks the values of the axis against the pot's codes.
func (c *checker) potSettings(a Axis, t *userfile.Table) {
	for i, v := range a.Values {
		want := ""
		if a.Set == SetPotResistance {
			want = c.potWrong(v)
		} else if v >= float64(c.bench.Pot.Codes) {
			want = fmt.Sprintf("code %g is none of this pot, 0 to %d (pot.codes of bench %q)", v, c.bench.Pot.Codes-1, c.bench.Bench)
		}
		if want != "" {
			t.FailItem(keyOf(t, i, len(a.Values)), i, want)
			return
		}
	}
}

// potWrong says why a resistance can't be set, or nothing.
func (c *checker) potWrong(ohms float64) string {
	if c.bench == nil || c.bench.Pot == nil || Reaches(*c.bench.Pot, ohms) {
		return ""
	}
	p := *c.bench.Pot
	return fmt.Sprintf("%s is out of the pot's reach, %s to %s (pot.end_to_end and pot.wiper of bench %q)",
		si.Ohms(ohms), p.Ohms(0), p.Ohms(p.Codes-1), c.bench.Bench)
}

// potVoltage checks the highest supply against the pot's terminals: at some
// instant of the period they see nearly all of it.
func (c *checker) potVoltage(t *userfile.Table) {
	a, _ := c.axis(func(a Axis) bool { return a.Set == SetSupplyVoltage })
	if a == nil || len(a.Values) == 0 {
		return
	}
	if high := slices.Max(a.Values); high > c.bench.Pot.MaxTerminalVoltage {
		t.Fail("set", fmt.Sprintf("at %s the pot's terminals would see more than their %s (pot.max_terminal_voltage of bench %q); lower the supply",
			si.Volts(high), si.Volts(c.bench.Pot.MaxTerminalVoltage), c.bench.Bench))
	}
}
