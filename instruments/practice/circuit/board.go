package circuit

import (
	"errors"
	"fmt"
)

// A Board is everything on the bench that has a true value: the source, the
// timing network, the timer, the stage behind it and the load. SI units.
type Board struct {
	Source  Source
	Timing  Timing
	Timer   Timer
	Driver  Driver
	Flyback *Diode // across the load, cathode at flyback_top; nil means none
	Load    Load
	Ambient float64 // K; 0 means Nominal
}

// A Source is the bench supply's output as the board meets it: a voltage
// behind a resistance, a current limit set from outside, one quadrant only
// (it can't pull its own output down), and the capacitance across it.
type Source struct {
	Resistance float64 // of output and leads, ohm; above 0
	Bulk       float64 // across the board's supply, F; above 0
	Bleed      float64 // across the supply's output, ohm; 0 means none
}

// A NetworkKind is how capacitor, resistors and diodes are joined.
type NetworkKind uint8

// The networks; Common, Up and Down are the resistors of Timing.
const (
	Plain     NetworkKind = iota // supply–Common–pin 7–Down–capacitor
	Bypassed                     // plain, and the charge diode across Down
	Steered                      // supply–Common–pin 7; a diode branch each way
	Wiper                        // steered, the pot's wiper at pin 7
	OutputFed                    // output–Common–W; a diode branch each way, or Down alone
	Clocked                      // no timer network: a clock outside sets the output
)

// A PotPlace is where the bench's pot stands.
type PotPlace uint8

// The places of the pot. At PotWiper its whole track is used: SetPot sets the
// ohms between wiper and charging end, the rest of the track discharges.
const (
	PotAbsent PotPlace = iota
	PotCommon
	PotUp
	PotDown
	PotWiper
)

// Timing is the timing network.
type Timing struct {
	Network                     NetworkKind
	Common, Up, Down            float64 // fixed ohms; in series with the pot where it stands
	Pot                         PotPlace
	PotTrack, PotWiperOhms      float64 // ohm; used at PotWiper only
	Capacitance                 float64 // F
	Leak                        float64 // across the capacitor, ohm; 0 means none
	ChargeDiode, DischargeDiode *Diode  // nil means a plain joint
	Period, Duty                float64 // of a Clocked board: s, fraction
}

// A Timer is the true timer.
type Timer struct {
	Threshold           float64 // upper level as a fraction of the supply, about 2/3
	Trigger             float64 // lower level as a fraction of the upper one, about 1/2
	TriggerCurrent      float64 // out of pin 2 into the capacitor, A
	ThresholdCurrent    float64 // into pin 6, A
	Delay               float64 // from a level crossed to the output's turn, s
	DischargeOffset     float64 // of pin 7 when on, V
	DischargeResistance float64 // of pin 7 when on, ohm
	Drop                Levels  // supply − output when high, against the current it sources
	DropPerKelvin       float64 // change of Drop with temperature, V/K
	Low                 Levels  // output when low, against the current it sinks
	PushPull            bool    // either transistor conducts both ways (CMOS)
	Clamp               Diode   // takes current the transistors can't, beyond either rail
	Quiescent           []Quiescent
	MinSupply           float64 // below it the timer is dead, V
	Rise, Fall          float64 // duration of the output's edges, s
}

// A Stage is what stands between the timer's output and the load.
type Stage uint8

// The stages; all but StageNone switch the load's low side.
const (
	StageNone Stage = iota
	NPN
	Darlington
	NMOS
)

// A Driver is the switch behind the timer. It conducts below Saturation +
// Resistance × current; a transistor given less base current than Gain needs
// falls out of saturation.
type Driver struct {
	Stage        Stage
	Saturation   float64 // V; 0 for NMOS
	Resistance   float64 // ohm; for NMOS the on-resistance at RatedGate
	BaseResistor float64 // ohm
	Vbe          float64 // V
	Gain         float64 // smallest current gain; 0 means ample
	GateLevel    float64 // threshold of the gate, V; 0 means always fully on
	RatedGate    float64 // gate voltage of Resistance, V
	Storage      float64 // turn-off delay, s
	Breakdown    float64 // where an interrupted winding is clamped, V
	Body         *Diode  // from common to load_lo; nil means none
	Edge         float64 // duration of the switch's own edges, s
}

// A LoadKind is what is driven.
type LoadKind uint8

// The loads.
const (
	Resistor LoadKind = iota
	Motor
)

// A Load is a resistor or a brushed motor. For a motor: torque is
// K × current; it starts above StaticTorque and then works against
// CoulombTorque + ViscousTorque ω + QuadraticTorque ω².
type Load struct {
	Kind       LoadKind
	ToSupply   bool    // with StageNone: from supply to output, else output to common
	Resistance float64 // ohm, at 27 °C for a motor's copper
	Burden     float64 // of the current meter between flyback_top and load_hi, ohm

	Inductance      float64 // H
	Constant        float64 // K, V s/rad = N m/A
	StaticTorque    float64 // N m; not below CoulombTorque
	CoulombTorque   float64 // N m
	ViscousTorque   float64 // N m s
	QuadraticTorque float64 // N m s²
	BrushDrop       float64 // V, both brushes
	Inertia         float64 // kg m²

	Cogging        float64 // peak, N m
	CoggingPerTurn float64
	Ripple         float64 // of Constant with angle, fraction
	RipplePerTurn  float64

	ThermalResistance float64 // winding to ambient, K/W; 0 means it stays at ambient
	ThermalCapacity   float64 // J/K
}

// check refuses a board that can't be simulated.
func (b *Board) check() error {
	t, m := &b.Timing, &b.Timer
	return errors.Join(
		above("source resistance", b.Source.Resistance, 0),
		above("bulk capacitance", b.Source.Bulk, 0),
		b.checkTiming(),
		within("threshold fraction", m.Threshold, 0.05, 0.95),
		within("trigger ratio", m.Trigger, 0.05, 0.95),
		notBelow("delay", m.Delay, 0),
		levels("output drop", m.Drop), levels("output low", m.Low),
		diodes(t.ChargeDiode, t.DischargeDiode, b.Flyback, b.Driver.Body),
		b.checkDriver(), b.checkLoad(),
	)
}

func (b *Board) checkTiming() error {
	t := &b.Timing
	if t.Network == Clocked {
		return errors.Join(above("clock period", t.Period, 0), within("clock duty", t.Duty, 0, 1))
	}
	err := errors.Join(above("capacitance", t.Capacitance, 0),
		notBelow("common resistor", t.Common, 0), notBelow("up resistor", t.Up, 0), notBelow("down resistor", t.Down, 0))
	up, down := t.ChargeDiode != nil, t.DischargeDiode != nil
	switch {
	case t.Network > Clocked:
		err = errors.Join(err, fmt.Errorf("circuit: unknown network %d", t.Network))
	case t.Network == Plain && up, t.Network != Steered && t.Network != Wiper && t.Network != OutputFed && down:
		err = errors.Join(err, errors.New("circuit: this network has no place for that diode"))
	case t.Network == Bypassed && !up:
		err = errors.Join(err, errors.New("circuit: a bypassed network needs its charge diode"))
	case (t.Network == Steered || t.Network == Wiper) && !(up && down), t.Network == OutputFed && up != down:
		err = errors.Join(err, errors.New("circuit: this network needs both diodes"))
	case (t.Network == Wiper) != (t.Pot == PotWiper):
		err = errors.Join(err, errors.New("circuit: a pot used by its wiper belongs to the wiper network, and the other way round"))
	case t.Pot == PotWiper:
		err = errors.Join(err, above("pot track", t.PotTrack, 0))
	}
	return err
}

func (b *Board) checkDriver() error {
	d := &b.Driver
	err := errors.Join(notBelow("driver resistance", d.Resistance, 0), notBelow("storage time", d.Storage, 0))
	if d.Stage == NPN || d.Stage == Darlington {
		err = errors.Join(err, above("base resistor", d.BaseResistor, 0))
	}
	if d.Stage != StageNone && b.Load.Kind == Motor && b.Flyback == nil {
		err = errors.Join(err, above("breakdown without a flyback diode", d.Breakdown, 0))
	}
	return err
}

func (b *Board) checkLoad() error {
	l := &b.Load
	err := errors.Join(above("load resistance", l.Resistance, 0), notBelow("meter burden", l.Burden, 0))
	if l.Kind != Motor {
		return err
	}
	if l.ThermalResistance > 0 {
		err = errors.Join(err, above("thermal capacity", l.ThermalCapacity, 0))
	}
	return errors.Join(err,
		above("inductance", l.Inductance, 0), above("torque constant", l.Constant, 0), above("inertia", l.Inertia, 0),
		notBelow("static torque", l.StaticTorque, l.CoulombTorque), notBelow("coulomb torque", l.CoulombTorque, 0),
		notBelow("viscous torque", l.ViscousTorque, 0), notBelow("quadratic torque", l.QuadraticTorque, 0))
}
