package bench

import (
	"fmt"
	"maps"
	"slices"
	"strconv"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// readable are the quantities that a meter can be put to, with the function it needs.
var readable = map[string]si.Unit{"average_voltage": si.Volt, "motor_current": si.Ampere, "output_current": si.Ampere, "control_voltage": si.Volt}

// meter reads one [[meter]].
func (r *reader) meter(t *userfile.Table) {
	r.out.Meters = append(r.out.Meters, r.port(t))
	var m instruments.MeterWiring
	if t.String("name", &m.Name) {
		r.oneName(t, m.Name)
	}
	unit, known := r.reads(t, &m)
	wired := between(t, &m.Between)
	r.meterInput(t, &m, unit, known)
	if earthedOf(t, false) && wired {
		r.onEarth(t, "between", m.Between[1])
	}
	t.Optional().Date("calibrated", &m.Calibrated)
	if t.Optional().Date("due", &m.Due) && m.Calibrated != "" && m.Due <= m.Calibrated {
		t.Fail("due", "has to be after the date of calibration, "+m.Calibrated)
	}
	for _, key := range []string{"aperture", "filter"} {
		t.NotYet(key, "leave it out: the aperture is chosen from the period")
	}
	r.out.Wiring.Meters = append(r.out.Wiring.Meters, m)
}

// reads reads what the meter is for. One quantity has one meter.
func (r *reader) reads(t *userfile.Table, m *instruments.MeterWiring) (si.Unit, bool) {
	if !t.String("reads", &m.Reads) {
		return "", false
	}
	unit, ok := readable[m.Reads]
	if !ok {
		t.Suggest("reads", m.Reads, slices.Sorted(maps.Keys(readable)),
			"use average_voltage, motor_current, output_current or control_voltage; nothing else is supported yet by this version")
		return "", false
	}
	for _, other := range r.out.Wiring.Meters {
		if other.Reads == m.Reads {
			t.Fail("reads", fmt.Sprintf("meter %q reads %s already; two meters on one quantity are not supported yet by this version", other.Name, m.Reads))
			return "", false
		}
	}
	return unit, true
}

func (r *reader) oneName(t *userfile.Table, name string) {
	for _, other := range r.out.Wiring.Meters {
		if other.Name == name {
			t.Fail("name", "another meter has this name; give each its own")
		}
	}
}

// meterInput reads what the meter does to the circuit and how well it measures.
func (r *reader) meterInput(t *userfile.Table, m *instruments.MeterWiring, unit si.Unit, known bool) {
	o := t.Optional()
	if known && unit == si.Volt {
		t.Refuse("burden", "only a meter that reads a current has one; a voltmeter has input_resistance")
	} else {
		atLeastZero(o, "burden", &si.Resistance{}, &m.Burden)
	}
	if known && unit == si.Ampere {
		t.Refuse("input_resistance", "only a meter that reads a voltage has one; an ammeter has burden")
	} else {
		above(o, "input_resistance", &si.Resistance{}, &m.InputResistance)
	}
	a := o.Table("accuracy")
	if !a.Present() {
		return
	}
	m.Accuracy = &instruments.Accuracy{}
	accuracy(a, m.Accuracy, unit)
}

// accuracy reads { reading = "0.012 %", range = "0.004 %", offset = "1 mV", resolution = "10 uV" }.
func accuracy(t *userfile.Table, v *instruments.Accuracy, unit si.Unit) {
	o := t.Optional()
	good := share(t, "reading", &v.Reading)
	share(o, "range", &v.Range)
	var volts si.Voltage
	var amperes si.Current
	q := number(&volts)
	if unit == si.Ampere {
		q = &amperes
	}
	atLeastZero(o, "offset", q, &v.Offset)
	atLeastZero(o, "resolution", q, &v.Resolution)
	if good && v.Reading == 0 && v.Range == 0 && v.Offset == 0 {
		t.Fail("", "no instrument is exact; give the maker's figures, like { reading = \"0.012 %\", range = \"0.004 %\" }")
	}
}

// share reads a ratio below one that says its unit: an accuracy of "0.012" could be either.
func share(t *userfile.Table, key string, v *float64) bool {
	const want = `has no unit; write it in % or ppm, like "0.012 %"`
	var text string
	switch {
	case t.IsNumber(key):
		t.Refuse(key, want)
		return false
	case !t.String(key, &text):
		return false
	case !strings.HasSuffix(text, "%") && !strings.HasSuffix(text, "ppm"):
		t.Correct(key, strconv.Quote(strings.TrimSpace(text)+" %"), want)
		return false
	case !atLeastZero(t, key, &si.Ratio{}, v):
		return false
	case *v >= 1:
		t.Fail(key, "has to be below 100 %")
		return false
	}
	return true
}
