package driver

import (
	"math"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// pollEvery is the wall time between two questions of "are you done?".
const pollEvery = 20 * time.Millisecond

// outcomes maps what the messages know to what readings carry.
var outcomes = map[scpi.Outcome]instruments.Outcome{
	scpi.Measured:      instruments.Measured,
	scpi.Overload:      instruments.Overload,
	scpi.NotANumber:    instruments.NotANumber,
	scpi.NoMeasurement: instruments.NoMeasurement,
}

// sample is a number as a reading: a value only when it is one.
func sample(n scpi.Number, unit si.Unit) instruments.Sample {
	s := instruments.Sample{Value: n.Value, Unit: unit, Outcome: outcomes[n.Outcome], Raw: n.Raw}
	if s.Outcome != instruments.Measured {
		s.Value = math.NaN()
	}
	return s
}
