package sweeps

import (
	"encoding"
	"fmt"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// ReadBoard reads a board file and, verbatim, the parts files beside it. Every
// mistake in the board file is reported, with its line.
func ReadBoard(path string) (Board, error) {
	f, err := userfile.Read(path)
	if err != nil {
		return Board{}, err
	}
	b, err := boardOf(f)
	parts, partsErr := partsBeside(path)
	if err := userfile.Join(err, partsErr); err != nil {
		return Board{}, err
	}
	b.Parts = parts
	return b, nil
}

func boardOf(f *userfile.File) (Board, error) {
	b := Board{Path: f.Name, Text: f.Source}
	t := f.Table("board")
	t.String("name", &b.Name)
	t.Optional().String("revision", &b.Revision)
	rated(t, &b.RatedSupply)
	timer(f.Table("timer"), &b.Timer)
	timing(f.Table("timing"), &b.Timing)
	driver(f.Table("driver"), &b.Driver)
	load(f.Table("load"), &b.Load, b.Driver.Stage)
	if d := f.Look("driver"); b.Load.Kind == Motor && d.Present() && !d.Has("flyback") {
		d.Fail("flyback", `is missing; a motor needs a flyback diode like "1N5819", or say that it has "none"`)
	}
	if err := f.Err(); err != nil {
		return Board{}, err
	}
	return b, nil
}

// rated reads the lowest and the highest supply voltage of a board.
func rated(t *userfile.Table, v *[2]si.Voltage) {
	var list []si.Voltage
	if !userfile.Texts(t, "rated_supply", &list) {
		return
	}
	if len(list) != 2 || list[0].SI() <= 0 || list[0].SI() >= list[1].SI() {
		t.Fail("rated_supply", `give the lowest and the highest supply voltage, like ["4.5 V", "12 V"]`)
		return
	}
	*v = [2]si.Voltage(list)
}

// timer reads the part and what the file overrides of it.
func timer(t *userfile.Table, v *Timer) {
	t.String("part", &v.Part)
	v.Threshold = override[si.TolRatio](t, "threshold", positive)
	v.Trigger = override[si.TolRatio](t, "trigger", positive)
	v.DischargeOffset = override[si.TolVoltage](t, "discharge_offset", notNegative)
	v.DischargeResistance = override[si.TolResistance](t, "discharge_resistance", notNegative)
	v.Delay = override[si.TolTime](t, "delay", notNegative)
	v.TriggerCurrent = override[si.TolCurrent](t, "trigger_current", notNegative)
	v.ThresholdCurrent = override[si.TolCurrent](t, "threshold_current", notNegative)
	v.Quiescent = override[si.TolCurrent](t, "quiescent", notNegative)
	v.MaxOutputCurrent = override[si.Current](t, "max_output_current", positive)
	v.Drop = outputTable(t, "drop")
	v.Low = outputTable(t, "low")
	fraction(t, "threshold", v.Threshold)
	fraction(t, "trigger", v.Trigger)
	if v.Threshold != nil && v.Trigger != nil && v.Trigger.SI() >= v.Threshold.SI() {
		t.Fail("trigger", fmt.Sprintf("has to be below the threshold, %g; half of it is usual", v.Threshold.SI()))
	}
}

func fraction(t *userfile.Table, key string, v *si.TolRatio) {
	if v != nil && v.SI() >= 1 {
		t.Fail(key, "has to be below 1: it is a fraction of the supply, like 0.667")
	}
}

// outputTable reads rows of current and voltage, the currents rising.
func outputTable(t *userfile.Table, key string) []CurrentVoltage {
	var rows []CurrentVoltage
	ok := userfile.Pairs(t.Optional(), key, func(i si.Current, v si.Voltage) {
		rows = append(rows, CurrentVoltage{Current: i, Voltage: v})
	})
	if !ok {
		return nil
	}
	for i, r := range rows {
		if r.Current.SI() < 0 || r.Voltage.SI() < 0 || i > 0 && r.Current.SI() <= rows[i-1].Current.SI() {
			t.Fail(key, fmt.Sprintf("row %d: no value may be below zero, and the currents have to rise", i+1))
			return nil
		}
	}
	return rows
}

// measure of a value that is read from text.
type number interface {
	encoding.TextUnmarshaler
	SI() float64
}

// A sign is which values a key takes.
type sign func(float64) (ok bool, want string)

func positive(x float64) (bool, string)    { return x > 0, "has to be above zero" }
func notNegative(x float64) (bool, string) { return x >= 0, "can't be below zero" }

// share is above none and at most the whole.
func share(x float64) (bool, string) {
	return x > 0 && x <= 1, `give a share of the track above 0 and up to 1, like 0.35 or "35 %"`
}

// signed reads a quantity of a sign.
func signed(t *userfile.Table, key string, v number, s sign) bool {
	if !t.Text(key, v) {
		return false
	}
	ok, want := s(v.SI())
	if !ok {
		t.Fail(key, want)
	}
	return ok
}

// override reads a quantity that may be left out.
func override[T any, P interface {
	*T
	number
}](t *userfile.Table, key string, s sign) *T {
	var v T
	if !signed(t.Optional(), key, P(&v), s) {
		return nil
	}
	return &v
}
