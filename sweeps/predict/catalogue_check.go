package predict

import (
	"errors"
	"fmt"

	"nightbench/instruments/userfile"
)

// check holds every part to what the laws need of it, and notes what is wrong in the file it was read from.
func (c *Catalogue) check(f *userfile.File) {
	for i, t := range c.Timers {
		note(f.Look("timer", i), t.check())
	}
	for i, d := range c.Diodes {
		note(f.Look("diode", i), d.check())
	}
	for i, t := range c.Transistors {
		note(f.Look("transistor", i), t.check())
	}
	for i, m := range c.Motors {
		note(f.Look("motor", i), m.check())
	}
}

// wrong is a mistake in a part; key is empty where it concerns the part as a whole.
type wrong struct {
	key string
	err error
}

func (w *wrong) Error() string {
	if w.key == "" {
		return w.err.Error()
	}
	return w.key + ": " + w.err.Error()
}

func wrongf(key, format string, a ...any) error { return &wrong{key, fmt.Errorf(format, a...)} }

// note puts a part's mistake at its key.
func note(t *userfile.Table, err error) {
	var w *wrong
	switch {
	case err == nil:
	case errors.As(err, &w):
		t.Fail(w.key, w.err.Error())
	default:
		t.Fail("", err.Error())
	}
}

// named figures of a part, for messages.
type named struct {
	key string
	Figure
}

func checkFigures(figures []named) error {
	for _, f := range figures {
		if err := f.check(); err != nil {
			return &wrong{f.key, err}
		}
		if f.spread().low < 0 {
			return wrongf(f.key, "%g is negative", f.spread().low)
		}
	}
	return nil
}

func (t TimerPart) check() error {
	if t.Name == "" {
		return wrongf("name", "a part needs a name")
	}
	for key, tables := range map[string][]level{"drop": t.Drop, "low": t.Low} {
		for _, table := range tables {
			if err := checkRows(table.Rows); err != nil {
				return wrongf(key, "table at %g V: %w", table.Supply, err)
			}
		}
	}
	th, ratio := t.Threshold.Typical, t.TriggerRatio.Typical
	if th <= 0 || th >= 1 || ratio <= 0 || ratio >= 1 {
		return wrongf("threshold", "threshold %g and trigger_ratio %g must lie between 0 and 1", th, ratio)
	}
	return checkFigures([]named{
		{"threshold", t.Threshold}, {"trigger_ratio", t.TriggerRatio}, {"control_resistance", t.ControlResistance},
		{"trigger_current", t.TriggerCurrent}, {"threshold_current", t.ThresholdCurrent}, {"discharge_leakage", t.DischargeLeakage},
		{"discharge_offset", t.DischargeOffset}, {"discharge_resistance", t.DischargeResistance}, {"delay", t.Delay}, {"edge", t.Edge},
		{"drop_scale", t.DropScale}, {"low_scale", t.LowScale}, {"quiescent_scale", t.QuiescentScale},
	})
}

// checkRows holds a table to rising currents and voltages that never fall.
func checkRows(rows [][2]float64) error {
	if len(rows) == 0 {
		return fmt.Errorf("no rows; give at least one current and its voltage")
	}
	for i, r := range rows {
		switch {
		case r[0] < 0 || r[1] < 0:
			return fmt.Errorf("row %d: %g A, %g V: neither may be negative", i+1, r[0], r[1])
		case i > 0 && r[0] <= rows[i-1][0]:
			return fmt.Errorf("row %d: current %g A does not rise over %g A; sort the rows", i+1, r[0], rows[i-1][0])
		case i > 0 && r[1] < rows[i-1][1]:
			return fmt.Errorf("row %d: voltage %g V falls below %g V although the current rises", i+1, r[1], rows[i-1][1])
		}
	}
	return nil
}

func (d DiodePart) check() error {
	if d.Name == "" {
		return wrongf("name", "a part needs a name")
	}
	if d.Is.Typical <= 0 || d.N.Typical <= 0 {
		return wrongf("is", "is %g A and n %g must be above 0", d.Is.Typical, d.N.Typical)
	}
	return checkFigures([]named{{"is", d.Is}, {"n", d.N}, {"rs", d.Rs}, {"shunt", d.Shunt}})
}

func (t TransistorPart) check() error {
	if t.Name == "" {
		return wrongf("name", "a part needs a name")
	}
	switch t.Kind {
	case "npn", "darlington":
		if t.HFEMin <= 0 {
			return wrongf("hfe_min", "hfe_min %g must be above 0", t.HFEMin)
		}
	case "nmos":
		for i, r := range t.Rds {
			if r[1] <= 0 || i > 0 && (r[0] <= t.Rds[i-1][0] || r[1] > t.Rds[i-1][1]) {
				return wrongf("rds", "rds row %d: %g V, %g ohm: gate voltages must rise and resistances fall, above 0", i+1, r[0], r[1])
			}
		}
		if len(t.Rds) == 0 || t.Rds[0][0] <= t.VgsTh.Typical {
			return wrongf("rds", "rds needs rows, all above the gate threshold of %g V", t.VgsTh.Typical)
		}
	default:
		return wrongf("kind", "kind %q is not known; use npn, darlington or nmos", t.Kind)
	}
	return checkFigures([]named{
		{"vbe", t.VBE}, {"base_resistance", t.BaseResistance}, {"vce_sat", t.VCESat}, {"saturation_resistance", t.SaturationResistance},
		{"beta_f", t.BetaF}, {"beta_r", t.BetaR}, {"vgs_th", t.VgsTh}, {"rds_scale", t.RdsScale},
	})
}

func (m MotorPart) check() error {
	if m.Name == "" || m.Resistance.Typical <= 0 || m.TorqueConstant.Typical <= 0 {
		return fmt.Errorf("a motor needs a name, a resistance and a torque_constant above 0")
	}
	return checkFigures([]named{
		{"resistance", m.Resistance}, {"inductance", m.Inductance}, {"torque_constant", m.TorqueConstant},
		{"static_torque", m.StaticTorque}, {"coulomb_torque", m.CoulombTorque}, {"viscous_torque", m.ViscousTorque}, {"quadratic_torque", m.QuadraticTorque},
		{"brush_drop", m.BrushDrop}, {"inertia", m.Inertia}, {"max_current", m.MaxCurrent}, {"max_power", m.MaxPower},
	})
}
