// Package pulse turns a captured waveform into pulse parameters after IEEE Std
// 181: state levels by histogram of the converter's codes, reference level
// instants by linear interpolation, state boundaries as hysteresis, and whole
// periods only. Every value comes with its uncertainty budget; what cannot be
// had from the record is left out and a flag says why.
//
// The driven state must be the high one. Across the load, or at the timer's
// output, it is. At load_lo of a low-side driver the node is low when driven:
// take Record.Against(supply), the voltage across the load, so that the levels
// of a freewheeling motor come out as driven (near the supply), freewheel
// (one diode drop below zero) and rest (the back-EMF).
package pulse

import (
	"fmt"

	"nightbench/sweeps/uncertainty"
)

// Record is one captured waveform. Samples are either converter codes (volts =
// Zero + PerCode·code) or, when Codes is nil, Volts. The codes are only read.
type Record struct {
	Codes   []int16
	Zero    float64 // V at code 0
	PerCode float64 // V per code; may be negative
	Volts   []float64

	// Resolution is the last digit Volts were written with, V; 0: in full.
	Resolution float64

	Start    float64   // s, time of the first sample
	Interval float64   // s between samples
	Times    []float64 // s, one per sample; nil: evenly spaced by Start and Interval

	ClipLow, ClipHigh *int16 // codes at which the converter saturates; nil: unknown

	// Instrument names scope, channel and range. Gain, offset and time base of two
	// records with the same name are the same causes, so they cancel in a comparison.
	Instrument string
	GainU      float64 // relative standard uncertainty of PerCode
	OffsetU    float64 // V, standard uncertainty of Zero
	TimeBaseU  float64 // relative standard uncertainty of Interval

	Flags []Flag // what whoever read the capture already knows of it

	pivot  float64 // V, where an error of gain has no effect
	turned bool    // the voltages are a supply's less the probe's
}

// Against returns the record of supply − node: what stands across a load whose
// upper end is on a supply of the given voltage (V) when the probe is on its lower
// end. Zero and OffsetU change; the uncertainty of the supply voltage itself is the
// caller's to add to levels and mean, and does not touch the times.
func (r Record) Against(supply float64) Record {
	r.Zero, r.PerCode = supply-r.Zero, -r.PerCode
	r.pivot, r.turned = supply-r.pivot, !r.turned
	if r.Codes == nil {
		volts := make([]float64, len(r.Volts))
		for i, v := range r.Volts {
			volts[i] = supply - v
		}
		r.Volts = volts
	}
	return r
}

// Class is what kind of waveform the record holds.
type Class string

const (
	TwoLevel      Class = "two-level"
	FreewheelRest Class = "freewheel and rest" // three levels a period: driven, freewheel, rest
	SaggingTop    Class = "sagging top"        // two levels, the high one falling through its state
	ConstantHigh  Class = "constant high"
	ConstantLow   Class = "constant low"
	Constant      Class = "constant" // no threshold was given to tell high from low
	NotPulses     Class = "not a pulse train"
)

// Flag says in words why a result deserves distrust. Name is short and fixed.
type Flag struct{ Name, Words string }

// The names of flags.
const (
	FewPeriods   = "too few periods"
	EdgeTooFast  = "edge below resolution"
	Clipped      = "clipped"
	Runt         = "runt"
	Undersampled = "undersampled"
	Notch        = "notch"
	Irregular    = "irregular"
	Sagging      = "sagging top"
	FewCodes     = "few codes"
	FewSamples   = "few samples"
	CoarseTime   = "coarse time stamps"
	UnevenTime   = "uneven time stamps"
	TimeBase     = "time base"
	Scale        = "scale"
	Noisy        = "noisy"
	FastRinging  = "fast ringing"
	Unsettled    = "unsettled level"
	ThirdLevel   = "third level"

	LevelsDisagree = "levels disagree"
)

// Quantity is one pulse parameter: its estimate and budget, and the flags that bear on it.
type Quantity struct {
	Name  string // as the bench calls it: "duty", "t_high", "high_level"
	Unit  string // "V", "s", "Hz"; "1" for a plain ratio
	Flags []Flag
	uncertainty.Budget
}

// Instant is where the waveform passes the 50 % reference level.
type Instant struct {
	T      float64 // s
	Rising bool
}

// Result is what a record yields. Quantities, in order of interest, as far as
// the class allows: duty, frequency, period, t_high, t_low, average_voltage,
// high_level, low_level, amplitude, rms, ripple, rise_time, fall_time, jitter,
// overshoot, undershoot (ratios of the amplitude), back_emf, conduction. Of three
// levels, high_level is the driven one, low_level the freewheel one, back_emf the rest.
type Result struct {
	Class      Class
	Periods    int // whole periods used
	Quantities []Quantity
	Flags      []Flag // every flag of the record, once
	Instants   []Instant
	Middle     float64 // V, the 50 % reference level
}

// Get finds a quantity by name; false when the record could not give it.
func (r Result) Get(name string) (Quantity, bool) {
	for _, q := range r.Quantities {
		if q.Name == name {
			return q, true
		}
	}
	return Quantity{}, false
}

// Flagged tells whether the record carries the named flag.
func (r Result) Flagged(name string) bool {
	for _, f := range r.Flags {
		if f.Name == name {
			return true
		}
	}
	return false
}

// Options are what the caller knows beside the record.
type Options struct {
	// Threshold (V) tells constant high from constant low; nil: not known.
	Threshold *float64
	// Expected is about the amplitude the board should have (V), such as its
	// supply; 0: not known. A tenfold departure is flagged as a wrong probe factor.
	Expected float64
}

// Analyse returns the pulse parameters of a record. The error is about records
// that are no measurement: fewer than three samples, values that are not numbers,
// times that run backwards, a scale of zero.
func Analyse(r Record, o Options) (Result, error) {
	t, err := newTrace(r)
	if err != nil {
		return Result{}, fmt.Errorf("analyse waveform: %w", err)
	}
	a := &analysis{trace: t, options: o}
	a.run()
	return a.result, nil
}
