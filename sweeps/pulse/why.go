package pulse

import (
	"fmt"
	"slices"
	"strings"
)

// Parameter is the name and unit of a quantity a record can give.
type Parameter struct{ Name, Unit string }

// Parameters are all quantities of pulse trains, in order of interest.
var Parameters = []Parameter{
	{"duty", "1"}, {"frequency", "Hz"}, {"period", "s"}, {"t_high", "s"}, {"t_low", "s"}, {"average_voltage", "V"}, {"high_level", "V"}, {"low_level", "V"},
	{"amplitude", "V"}, {"rms", "V"}, {"ripple", "V"}, {"rise_time", "s"}, {"fall_time", "s"}, {"jitter", "s"}, {"overshoot", "1"}, {"undershoot", "1"},
	{"back_emf", "V"}, {"conduction", "1"},
}

// Why says, in flags, why the result has no quantity of the name; nil when it has.
func (r Result) Why(name string) []Flag {
	if _, ok := r.Get(name); ok {
		return nil
	}
	if u := unitOf(name); (u == "s" || u == "Hz") && r.untimed() {
		return r.named(TimeBase, "the sample interval is not known")
	}
	what := strings.ReplaceAll(name, "_", " ")
	switch r.Class {
	case TwoLevel, SaggingTop, FreewheelRest:
		switch {
		case name == "back_emf" || name == "conduction":
			return []Flag{{string(r.Class), fmt.Sprintf("no rest between freewheel and drive is seen, so there is no %s", what)}}
		case name == "jitter":
			return r.named(FewPeriods, "one whole period has no jitter")
		}
		return r.named(EdgeTooFast, "the record does not resolve the "+what)
	}
	flags := slices.Clone(r.Flags)
	if !r.Flagged(string(r.Class)) {
		flags = append(flags, Flag{string(r.Class), fmt.Sprintf("the waveform is %s: it has no %s", r.Class, what)})
	}
	return flags
}

// named is the record's flag of the name, or one with the words given.
func (r Result) named(name, words string) []Flag {
	for _, f := range r.Flags {
		if f.Name == name {
			return []Flag{f}
		}
	}
	return []Flag{{name, words}}
}

func unitOf(name string) string {
	for _, p := range Parameters {
		if p.Name == name {
			return p.Unit
		}
	}
	return ""
}

// untimed tells a result whose times were taken away.
func (r Result) untimed() bool {
	_, timed := r.Get("period")
	return r.Periods > 0 && !timed
}

// Untimed returns the result of a record whose sample interval is not known, less all
// that is a time: Interval was 1, and instants are in samples.
func (r Result) Untimed() Result {
	r.Quantities = slices.DeleteFunc(slices.Clone(r.Quantities), func(q Quantity) bool { return q.Unit == "s" || q.Unit == "Hz" })
	return r
}
