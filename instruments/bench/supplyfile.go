package bench

import (
	"fmt"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// supply reads [supply] and checks its limits against each other.
func (r *reader) supply(t *userfile.Table) {
	w := &r.out.Wiring.Supply
	r.out.Supply = r.port(t)
	r.out.Supply.Channel = 1
	t.Optional().Int("channel", &r.out.Supply.Channel, 1, 8)
	voltage := above(t, "max_voltage", &si.Voltage{}, &w.MaxVoltage)
	current := above(t, "max_current", &si.Current{}, &w.MaxCurrent)
	if above(t, "over_voltage", &si.Voltage{}, &w.OverVoltage) && voltage && w.OverVoltage <= w.MaxVoltage {
		t.Correct("over_voltage", fmt.Sprintf("\"%g V\"", w.MaxVoltage+1), fmt.Sprintf("has to be above max_voltage, %s, or it would act in normal work; about 1 V above is usual", si.Volts(w.MaxVoltage)))
	}
	if above(t.Optional(), "fuse", &si.Current{}, &w.Fuse) && current && w.Fuse < w.MaxCurrent {
		t.Fail("fuse", fmt.Sprintf("is below max_current, %s: it would blow in normal work; lower max_current or fit a larger fuse", si.Amperes(w.MaxCurrent)))
	}
	wired := between(t, &w.Between)
	if earthedOf(t, false) && wired {
		r.onEarth(t, "between", w.Between[1])
	}
	for _, key := range []string{"sense", "lead_resistance"} {
		t.NotYet(key, "leave it out, and keep the leads short: their drop is not corrected")
	}
}
