package sweeps

import (
	"encoding"
	"fmt"
	"math"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// maxPoints bounds one axis; a pot of 10 bits has 1025 codes.
const maxPoints = 2000

// axis reads one [[axis]]. Values are kept in the order written, which has to rise: the direction says which way to travel.
func axis(t *userfile.Table) Axis {
	a := Axis{Direction: Up, Line: t.Line()}
	userfile.Word(t.Optional(), "direction", &a.Direction, Up, Down, Both, Shuffled)
	if !settable(t, &a.Set) {
		t.Known("values", "from", "to", "points", "spacing")
		return a
	}
	if t.Has("values") {
		for _, key := range []string{"from", "to", "points", "spacing"} {
			t.Refuse(key, "give either values, or from, to and points")
		}
		listed(t, &a)
	} else {
		spread(t, &a)
	}
	return a
}

// settable reads what the axis sets, as far as this version can set it.
func settable(t *userfile.Table, s *Setting) bool {
	var word string
	if !t.String("set", &word) {
		return false
	}
	*s = Setting(word)
	switch *s {
	case SetSupplyVoltage, SetPotResistance, SetPotCode, SetPotPosition:
		return true
	case SetTimerOutput:
		t.Fail("set", "not supported yet by this version; use supply_voltage, pot_resistance, pot_code or pot_position")
	default:
		t.Suggest("set", word, []string{string(SetSupplyVoltage), string(SetPotResistance), string(SetPotCode), string(SetPotPosition)},
			"nothing on a bench sets that; use supply_voltage, pot_resistance, pot_code or pot_position")
	}
	*s = ""
	return false
}

// listed reads the values of an axis.
func listed(t *userfile.Table, a *Axis) {
	switch a.Set {
	case SetSupplyVoltage:
		a.Values = values[si.Voltage](t, "values")
	case SetPotResistance:
		a.Values = values[si.Resistance](t, "values")
	case SetPotPosition:
		a.Values = values[si.Ratio](t, "values")
	case SetPotCode:
		var codes []int
		t.Ints("values", &codes, 0, math.MaxInt32)
		for _, c := range codes {
			a.Values = append(a.Values, float64(c))
		}
	}
	for i, v := range a.Values {
		ok, want := a.Set.bounds(v)
		switch {
		case i > 0 && v <= a.Values[i-1]:
			t.FailItem("values", i, "is not above the one before it; write them rising, each once, and say the way with direction")
			return
		case !ok:
			t.FailItem("values", i, want)
			return
		}
	}
	if len(a.Values) > maxPoints {
		t.Fail("values", fmt.Sprintf("has %d values; at most %d are stepped", len(a.Values), maxPoints))
	}
}

// bounds says whether anything of the kind can be set to a value, and what is wrong otherwise.
func (s Setting) bounds(v float64) (bool, string) {
	switch s {
	case SetSupplyVoltage:
		return positive(v)
	case SetPotPosition:
		return share(v)
	}
	return notNegative(v)
}

// values reads a list of quantities as SI numbers.
func values[T interface{ SI() float64 }, P interface {
	*T
	encoding.TextUnmarshaler
}](t *userfile.Table, key string) []float64 {
	var list []T
	if !userfile.Texts[T, P](t, key, &list) {
		return nil
	}
	out := make([]float64, len(list))
	for i, v := range list {
		out[i] = v.SI()
	}
	return out
}

// spread reads from, to, points and spacing and lays the values out.
func spread(t *userfile.Table, a *Axis) {
	if !t.Has("from") && !t.Has("to") && !t.Has("points") {
		t.Known("from", "to", "points", "spacing")
		t.Known("values")
		t.Fail("", "give values, or from, to and points")
		return
	}
	t.Known("values")
	from, okFrom := end(t, "from", a.Set)
	to, okTo := end(t, "to", a.Set)
	n := 0
	okPoints := t.Int("points", &n, 2, maxPoints)
	spacing := "linear"
	userfile.Word(t.Optional(), "spacing", &spacing, "linear", "log")
	switch {
	case !okFrom || !okTo || !okPoints:
		return
	case to <= from:
		t.Fail("to", "has to be above from; say the way with direction")
		return
	case spacing == "log" && from <= 0:
		t.Fail("from", `has to be above zero with spacing = "log"`)
		return
	}
	a.Values = laid(from, to, n, spacing == "log")
	if a.Set == SetPotCode {
		a.Values = whole(a.Values)
	}
}

// end reads one end of a range.
func end(t *userfile.Table, key string, set Setting) (float64, bool) {
	switch set {
	case SetSupplyVoltage:
		var v si.Voltage
		return quantityEnd(t, key, &v, set.bounds)
	case SetPotResistance:
		var v si.Resistance
		return quantityEnd(t, key, &v, set.bounds)
	case SetPotPosition:
		var v si.Ratio
		return quantityEnd(t, key, &v, set.bounds)
	}
	var code int
	ok := t.Int(key, &code, 0, math.MaxInt32)
	return float64(code), ok
}

func quantityEnd(t *userfile.Table, key string, v number, s sign) (float64, bool) {
	ok := signed(t, key, v, s)
	return v.SI(), ok
}

// laid spreads n values from one end to the other, both ends exact.
func laid(from, to float64, n int, log bool) []float64 {
	out := make([]float64, n)
	for i := range out {
		x := float64(i) / float64(n-1)
		if log {
			out[i] = from * math.Pow(to/from, x)
		} else {
			out[i] = from + x*(to-from)
		}
	}
	out[0], out[n-1] = from, to
	return out
}

// whole rounds to whole codes, each once.
func whole(values []float64) []float64 {
	var out []float64
	for _, v := range values {
		if r := math.Round(v); len(out) == 0 || r > out[len(out)-1] {
			out = append(out, r)
		}
	}
	return out
}

// noAxisTwice refuses two axes that set the same thing.
func noAxisTwice(f *userfile.File, axes []Axis) {
	for i, a := range axes {
		for j, b := range axes[:i] {
			if a.Set != "" && a.actuator() == b.actuator() {
				f.Look("axis", i).Fail("set", fmt.Sprintf("axis %d (line %d) sets %s already; put all values in one axis", j+1, b.Line, b.actuator()))
				break
			}
		}
	}
}

// actuator is what has to move for the axis.
func (a Axis) actuator() string {
	if a.TurnsPot() {
		return "the pot"
	}
	return string(a.Set)
}

// TurnsPot tells whether the axis steps the pot.
func (a Axis) TurnsPot() bool {
	return a.Set == SetPotResistance || a.Set == SetPotCode || a.Set == SetPotPosition
}
