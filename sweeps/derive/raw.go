// Package derive turns what the instruments answered at a setpoint into
// readings: each wanted quantity by its best road, other roads compared with it,
// every value with the uncertainty it deserves. It is pure: stored raw data can
// be derived again.
package derive

import (
	"nightbench/instruments"
	"nightbench/sweeps"
)

// Raw is everything the instruments answered at one setpoint.
type Raw struct {
	Setpoint sweeps.Setpoint
	Supply   []instruments.SupplyState // one a repeat
	Meters   [][]instruments.Sample    // by meter, in the order of the wiring; one a repeat
	Records  [][]instruments.Waveform  // one a repeat; by channel
}

// SupplyVoltage is the mean of the supply's own readings, V; what was set where there is none.
func (raw Raw) SupplyVoltage() float64 {
	sum, n := 0.0, 0
	for _, s := range raw.Supply {
		if s.Voltage.Outcome == instruments.Measured {
			sum += s.Voltage.Value
			n++
		}
	}
	if n == 0 {
		return raw.Setpoint.Supply
	}
	return sum / float64(n)
}

// Kept are the newest record's waveforms, as a journal keeps them with a point.
func (raw Raw) Kept(w instruments.Wiring) []sweeps.Record {
	if len(raw.Records) == 0 || w.Scope == nil {
		return nil
	}
	var kept []sweeps.Record
	for _, f := range raw.Records[len(raw.Records)-1] {
		for _, c := range w.Scope.Channels {
			if c.Number != f.Channel {
				continue
			}
			kept = append(kept, sweeps.Record{
				Node: string(c.Between[0]) + " less " + string(c.Between[1]), Channel: f.Channel, Start: f.Start, Interval: f.Interval,
				VoltsPerCode: f.VoltsPerCode, VoltsAtZero: f.VoltsAtZero, Codes: f.Codes,
			})
		}
	}
	return kept
}
