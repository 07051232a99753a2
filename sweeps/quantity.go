// Package sweeps holds the nouns of the work: the board, the plan, a setpoint,
// a point and its readings, a run and the entries of its journal. Files are
// read and checked here; nothing in this package talks to an instrument.
package sweeps

import "nightbench/instruments/si"

// Quantity is the name of a measurable.
type Quantity string

// The quantities. Each has one SI unit for ever.
const (
	Duty           Quantity = "duty"
	Frequency      Quantity = "frequency"
	Period         Quantity = "period"
	THigh          Quantity = "t_high"
	TLow           Quantity = "t_low"
	AverageVoltage Quantity = "average_voltage"
	HighLevel      Quantity = "high_level"
	LowLevel       Quantity = "low_level"
	OutputDrop     Quantity = "output_drop"
	Ripple         Quantity = "ripple"
	RiseTime       Quantity = "rise_time"
	FallTime       Quantity = "fall_time"
	Jitter         Quantity = "jitter"
	Overshoot      Quantity = "overshoot"
	MotorCurrent   Quantity = "motor_current"
	OutputCurrent  Quantity = "output_current"
	SupplyVoltage  Quantity = "supply_voltage"
	SupplyCurrent  Quantity = "supply_current"
	SupplyPower    Quantity = "supply_power"
	BackEMF        Quantity = "back_emf"
	Conduction     Quantity = "conduction"
	Speed          Quantity = "speed"
	PotResistance  Quantity = "pot_resistance"
	ControlVoltage Quantity = "control_voltage"
	Ambient        Quantity = "ambient"
)

// Quantities lists every quantity in the order they are shown, with its unit.
var Quantities = []struct {
	Name Quantity
	Unit si.Unit
}{
	{Duty, si.One}, {Frequency, si.Hertz}, {Period, si.Second}, {THigh, si.Second}, {TLow, si.Second},
	{AverageVoltage, si.Volt}, {HighLevel, si.Volt}, {LowLevel, si.Volt}, {OutputDrop, si.Volt}, {Ripple, si.Volt},
	{RiseTime, si.Second}, {FallTime, si.Second}, {Jitter, si.Second}, {Overshoot, si.One},
	{MotorCurrent, si.Ampere}, {OutputCurrent, si.Ampere}, {SupplyVoltage, si.Volt}, {SupplyCurrent, si.Ampere}, {SupplyPower, si.Watt},
	{BackEMF, si.Volt}, {Conduction, si.One}, {Speed, si.RadianPerSec}, {PotResistance, si.Ohm}, {ControlVoltage, si.Volt}, {Ambient, si.Celsius},
}

// Unit is the quantity's SI unit; empty for a name that is no quantity.
func (q Quantity) Unit() si.Unit {
	for _, k := range Quantities {
		if k.Name == q {
			return k.Unit
		}
	}
	return ""
}

// Known tells whether q is a quantity's name.
func (q Quantity) Known() bool { return q.Unit() != "" }
