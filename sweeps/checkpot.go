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
	timing := c.board.Timing
	uses := timing.UsesPot()
	switch {
	case timing.Network == Wiper && !uses:
		c.f.Fail("axis", fmt.Sprintf(`the pot of %s (timing.pot) is turned by hand, which is not supported yet by this version; put the bench's in its place: pot = "pot"`, c.boardName()))
	case a == nil && timing.Track.Pot:
		c.f.Fail("axis", `the board is timed by the pot and no axis says where it stands; add one, if only with one value: set = "pot_position", values = ["35 %"]`)
	case a == nil && uses:
		c.f.Fail("axis", `the board is timed by the pot and no axis says where it stands; add one, if only with one value: set = "pot_resistance", values = ["10k"]`)
	case a == nil:
	case !uses:
		t.Fail("set", fmt.Sprintf(`the board has no pot: no resistor in [timing] of %s is "pot"; leave this axis out`, c.boardName()))
	case timing.Track.Pot && a.Set != SetPotPosition:
		c.needsPosition(*a, t)
	case !timing.Track.Pot && a.Set == SetPotPosition:
		t.Fail("set", fmt.Sprintf(`a position is set on boards with network = "wiper" and the bench's pot as timing.pot; of %s one resistor is the pot: set = "pot_resistance", in ohms`, c.boardName()))
	case c.bench != nil && c.bench.Pot == nil:
		t.Fail("set", fmt.Sprintf("bench %q has no pot; add [pot] to the bench file", c.bench.Bench))
	case c.bench != nil:
		c.potSettings(*a, t)
		c.potVoltage(t)
	}
}

// needsPosition refuses ohms or codes where the pot's wiper stands in the network. The
// one line is corrected where the values are shares already.
func (c *checker) needsPosition(a Axis, t *userfile.Table) {
	const why = `both ends of the pot are in the timing network (network = "wiper"): what is set is the share of its track that charges, `
	const line = `"` + string(SetPotPosition) + `"`
	for _, v := range a.Values {
		if ok, _ := share(v); !ok {
			t.Fail("set", why+`like: set = `+line+`, values = ["20 %", "50 %", "80 %"]`)
			return
		}
	}
	t.Correct("set", line, why+"axis "+string(SetPotPosition))
}

// potSettings checks the values of the axis against the pot's codes.
func (c *checker) potSettings(a Axis, t *userfile.Table) {
	for i, v := range a.Values {
		want := ""
		switch {
		case a.Set == SetPotResistance:
			want = c.potWrong(v)
		case a.Set == SetPotPosition:
			want = c.positionWrong(v)
		case v >= float64(c.bench.Pot.Codes):
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

// positionWrong says why a share of the track can't be set, or nothing.
func (c *checker) positionWrong(share float64) string {
	if c.bench == nil || c.bench.Pot == nil || ReachesPosition(*c.bench.Pot, share) {
		return ""
	}
	p := *c.bench.Pot
	return fmt.Sprintf("%s of the track is out of the pot's reach, %s to %s (pot.codes of bench %q)",
		si.Percent(share), si.Percent(p.Position(p.Codes-2)), si.Percent(p.Position(0)), c.bench.Bench)
}

// potKey is one way to say where the pot stands, with what was given; 0: nothing.
type potKey struct {
	key, like string
	given     float64
	wrong     func(float64) string
}

// warmUpPot checks where the pot stands in the warm-up: in ohms, or with its wiper in the network by position.
func (c *checker) warmUpPot(at Held, t *userfile.Table) {
	due := potKey{string(SetPotResistance), `"10k"`, at.Pot.SI(), c.potWrong}
	other := potKey{string(SetPotPosition), `"35 %"`, at.Position.SI(), c.positionWrong}
	if c.board.Timing.Track.Pot {
		due, other = other, due
	}
	uses := c.board.Timing.UsesPot()
	for _, k := range []potKey{due, other} {
		if !uses && k.given != 0 {
			t.Fail(k.key, "the board has no pot ("+c.boardName()+" gives no resistor as \"pot\"); leave it out")
		}
	}
	switch {
	case !uses:
	case other.given != 0:
		t.Fail(other.key, fmt.Sprintf("the pot of a board with network = %q (%s) is set by %s; write it like %s = %s", c.board.Timing.Network, c.boardName(), due.key, due.key, due.like))
	case due.given == 0:
		t.Fail(due.key, "is missing; the board is timed by the pot: say where it stands, like "+due.like)
	default:
		if want := due.wrong(due.given); want != "" {
			t.Fail(due.key, want)
		}
	}
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
