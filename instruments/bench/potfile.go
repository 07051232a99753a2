package bench

import (
	"fmt"
	"strconv"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// pot reads [pot].
func (r *reader) pot(t *userfile.Table) {
	if !t.Present() {
		return
	}
	p := r.port(t)
	r.out.Pot = &p
	w := &instruments.PotWiring{}
	r.out.Wiring.Pot = w
	t.NotYet("calibration", `give end_to_end with its tolerance, like "100k 20%"`)
	var ends si.TolResistance
	if above(t, "end_to_end", &ends, &w.EndToEnd) {
		w.Tolerance = ends.Tolerance
		if ends.Normal {
			t.Fail("end_to_end", "a normal distribution is not supported yet here; leave out the word normal: the tolerance is then a limit")
		}
	}
	atLeastZero(t, "wiper", &si.Resistance{}, &w.Wiper)
	above(t, "max_terminal_voltage", &si.Voltage{}, &w.MaxTerminalVoltage)
	above(t, "max_current", &si.Current{}, &w.MaxCurrent)
	// 65,537 codes would be a part of 16 bits; none of more is made (common practice, no source).
	codes := t.Int("codes", &w.Codes, 2, 65_537)
	if t.Int("park", &w.Park, 0, 65_536) && codes && w.Park >= w.Codes {
		t.Correct("park", strconv.Itoa(w.Codes-1), fmt.Sprintf("the codes of this pot are 0 to %d", w.Codes-1))
	}
	// The bridge of an earthed pot ties the board's common to earth.
	if earthedOf(t, false) {
		r.onEarth(t, "earthed", instruments.NodeCommon)
	}
}
