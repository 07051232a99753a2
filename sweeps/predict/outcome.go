package predict

import (
	"math"

	"nightbench/sweeps"
)

// The quantities predicted, in the order of a row of values.
var predicted = [...]sweeps.Quantity{
	sweeps.Duty, sweeps.Frequency, sweeps.Period, sweeps.THigh, sweeps.TLow,
	sweeps.AverageVoltage, sweeps.HighLevel, sweeps.LowLevel, sweeps.OutputDrop,
	sweeps.RiseTime, sweeps.FallTime,
	sweeps.MotorCurrent, sweeps.OutputCurrent, sweeps.SupplyVoltage, sweeps.SupplyCurrent, sweeps.SupplyPower,
	sweeps.BackEMF, sweeps.Conduction, sweeps.Speed, sweeps.PotResistance, sweeps.ControlVoltage, sweeps.Ambient,
}

// Where each quantity stands in a row, in the order of predicted.
const (
	qDuty = iota
	qFrequency
	qPeriod
	qTHigh
	qTLow
	qAverageVoltage
	qHighLevel
	qLowLevel
	qOutputDrop
	qRiseTime
	qFallTime
	qMotorCurrent
	qOutputCurrent
	qSupplyVoltage
	qSupplyCurrent
	qSupplyPower
	qBackEMF
	qConduction
	qSpeed
	qPotResistance
	qControlVoltage
	qAmbient
)

// Quantities lists what is predicted, in a fixed order. Levels, duty and times are
// the timer output's (pin 3 to common); average_voltage and output_drop are the load's
// own terminals', the first unless Options.Average has it elsewhere; motor_current is the load's whatever it is; output_current is
// what pin 3 delivers (or sinks, for a load to the supply), averaged over the period.
func Quantities() []sweeps.Quantity { return append([]sweeps.Quantity(nil), predicted[:]...) }

// row is a value for each predicted quantity; not a number where there is none.
type row [len(predicted)]float64

// row lays out the outcome.
func (o *outcome) row() row {
	none := math.NaN()
	var r row
	for i := range r {
		r[i] = none
	}
	r[qSupplyVoltage] = o.supply
	r[qAmbient] = o.temperature
	r[qControlVoltage] = o.threshold
	if o.usesPot {
		r[qPotResistance] = o.pot
	}
	if o.stop != oscillates {
		return r
	}
	if o.held == Oscillating {
		o.timeRow(&r)
	}
	if o.high > 0 {
		r[qHighLevel] = o.highLevel
	}
	if o.low > 0 {
		r[qLowLevel] = o.lowLevel
	}
	o.loadRow(&r)
	return r
}

// timeRow is what the timing network decides.
func (o *outcome) timeRow(r *row) {
	period := o.high + o.low
	r[qDuty] = o.high / period
	r[qFrequency] = 1 / period
	r[qPeriod] = period
	r[qTHigh] = o.high
	r[qTLow] = o.low
	if o.edge > 0 {
		r[qRiseTime] = o.edge
		r[qFallTime] = o.edge
	}
}

// loadRow is what the load decides. Of a transistor out of saturation there is
// nothing to say but its dissipation: it has no level.
func (o *outcome) loadRow(r *row) {
	if o.starved {
		return
	}
	on := &o.wave.spells[driven]
	r[qAverageVoltage] = o.average
	if on.t > 0 && o.isOn {
		r[qOutputDrop] = o.supply - on.volts/on.t
	}
	r[qMotorCurrent] = o.wave.current()
	r[qOutputCurrent] = o.outputCurrent
	r[qSupplyCurrent] = o.supplyCurrent
	r[qSupplyPower] = o.supplyCurrent * o.supply
	r[qConduction] = 1 - o.wave.spells[resting].t/o.wave.period()
	if o.k > 0 {
		r[qBackEMF] = o.emf
		r[qSpeed] = o.emf / o.k
	}
}

// values is the row as a map, without what has no value.
func (o *outcome) values() map[sweeps.Quantity]float64 {
	r := o.row()
	out := make(map[sweeps.Quantity]float64, len(r))
	for i, v := range r {
		if !math.IsNaN(v) {
			out[predicted[i]] = v
		}
	}
	return out
}
