package instruments

import (
	"time"

	"nightbench/instruments/si"
)

// Outcome says what kind of thing a reply was. Only Measured carries a number that may be used.
type Outcome string

// The outcomes of a reading (SCPI-1999 9.9E37 and 9.91E37 among them).
const (
	Measured      Outcome = "measured"
	Overload      Outcome = "overload"
	NotANumber    Outcome = "not a number"
	NoMeasurement Outcome = "no measurement"
)

// Accuracy is a maker's figure for one function and range: the limit of error at
// a value x on range r is Reading·|x| + Range·r + Offset. Resolution is one step
// of the display or converter. Offset and Resolution are in the unit measured.
type Accuracy struct {
	Reading    float64 `json:"reading"`
	Range      float64 `json:"range"`
	Offset     float64 `json:"offset"`
	Resolution float64 `json:"resolution"`
}

// Limit is the half-width of the error interval at value x on range r.
func (a Accuracy) Limit(x, r float64) float64 {
	if x < 0 {
		x = -x
	}
	return a.Reading*x + a.Range*r + a.Offset
}

// Sample is one reply of a meter or a supply, interpreted, with the reply beside it.
// Value is NaN unless Outcome is Measured.
type Sample struct {
	Value    float64   `json:"value"`
	Unit     si.Unit   `json:"unit"`
	Outcome  Outcome   `json:"outcome"`
	Raw      string    `json:"raw"`
	Range    float64   `json:"range"`    // in force, in Unit
	Aperture float64   `json:"aperture"` // s of bench time
	Accuracy Accuracy  `json:"accuracy"` // for the range in force
	At       time.Time `json:"at"`
}

// Waveform is one channel of one record as the converter gave it:
// volts = code·VoltsPerCode + VoltsAtZero, the instant of sample i is Start + i·Interval
// (s, from the trigger). Codes at or beyond ClipLow and ClipHigh are flags, not volts.
// Probe attenuation is included already.
type Waveform struct {
	Channel      int       `json:"channel"`
	Codes        []int16   `json:"codes"`
	Start        float64   `json:"start"`
	Interval     float64   `json:"interval"`
	VoltsPerCode float64   `json:"volts_per_code"`
	VoltsAtZero  float64   `json:"volts_at_zero"`
	ClipLow      int16     `json:"clip_low"`
	ClipHigh     int16     `json:"clip_high"`
	Triggered    bool      `json:"triggered"`
	Accuracy     Accuracy  `json:"accuracy"`   // Range is the share of full scale
	FullScale    float64   `json:"full_scale"` // V, peak to peak over the whole screen
	TimeBase     float64   `json:"time_base"`  // relative limit of error of Interval
	At           time.Time `json:"at"`
}
