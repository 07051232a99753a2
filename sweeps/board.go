package sweeps

import "nightbench/instruments/si"

// Board is a board file: schematic values and tolerances.
type Board struct {
	Name        string
	Revision    string
	RatedSupply [2]si.Voltage // lowest, highest

	Timer  Timer
	Timing Timing
	Driver Driver
	Load   Load
	Parts  []File // the user's own catalogue: the *.parts.toml beside the board file, verbatim, by name

	Path string // file it was read from
	Text string // verbatim
}

// Network names a timing network (five of them; what lies where is in the design's circuit laws).
type Network string

// The timing networks.
const (
	Plain     Network = "plain"
	Bypassed  Network = "bypassed"
	Steered   Network = "steered"
	Wiper     Network = "wiper"
	OutputFed Network = "output-fed"
)

// Timer is a catalogue part and what the board file overrides of it. A nil override leaves the part's figure.
type Timer struct {
	Part                string
	Threshold           *si.TolRatio // fraction of the supply
	Trigger             *si.TolRatio // fraction of the supply; kept as a ratio to Threshold
	DischargeOffset     *si.TolVoltage
	DischargeResistance *si.TolResistance
	Delay               *si.TolTime
	TriggerCurrent      *si.TolCurrent // flows out of pin 2 into the capacitor
	ThresholdCurrent    *si.TolCurrent // flows into pin 6
	Quiescent           *si.TolCurrent
	Drop                []CurrentVoltage // supply less high output, at sourced current
	Low                 []CurrentVoltage // low output, at sunk current
	MaxOutputCurrent    *si.Current
}

// CurrentVoltage is one row of an output table.
type CurrentVoltage struct {
	Current si.Current
	Voltage si.Voltage
}

// Diode is a catalogue name, or inline parameters, or none.
type Diode struct {
	None bool
	Name string  // catalogue name; empty where given inline
	Is   float64 // A
	N    float64 // emission coefficient
	Rs   float64 // Ω
}

// Resistor is a fixed resistance with tolerance, or the bench's pot.
type Resistor struct {
	Pot   bool
	Value si.TolResistance
}

// Timing is the timing network.
type Timing struct {
	Network        Network
	Charge         Resistor         // R_A; output-fed: the charging branch
	Discharge      Resistor         // R_B; output-fed: the discharging branch
	Common         Resistor         // output-fed only
	Track          Resistor         // wiper only: the pot end to end
	Stop           si.TolResistance // in series with the pot
	StopUp         si.TolResistance // wiper only
	StopDown       si.TolResistance // wiper only
	Capacitor      si.TolCapacitance
	ChargeDiode    Diode
	DischargeDiode Diode
	Control        *Control // nil: pin 5 open
}

// Control is a voltage fed to pin 5 through a resistance.
type Control struct {
	Voltage    si.Voltage
	Resistance si.Resistance
}

// Stage names what stands between timer and load.
type Stage string

// The driver stages.
const (
	StageNone       Stage = "none"
	StageNPN        Stage = "npn"
	StageDarlington Stage = "darlington"
	StageNMOS       Stage = "nmos"
)

// Transistor is a catalogue name or inline parameters of the kind its stage needs.
type Transistor struct {
	Name        string
	VBE, VCESat float64 // V
	HFEMin      float64
	RdsOn       float64 // Ω
	VgsTh       float64 // V
}

// Driver is the output stage.
type Driver struct {
	Stage        Stage
	Part         Transistor
	BaseResistor *si.TolResistance // npn, darlington
	GateResistor *si.TolResistance // nmos
	Flyback      Diode
}

// LoadKind is motor or resistor.
type LoadKind string

// The loads.
const (
	Motor        LoadKind = "motor"
	ResistorLoad LoadKind = "resistor"
)

// Load is what the board drives. With stage none it goes to ground or to the supply.
// Of a catalogue motor, what the board file leaves out (zero here) is the part's.
type Load struct {
	Kind            LoadKind
	Part            string // a catalogue motor; empty: all figures stand in the board file
	ToSupply        bool   // stage none: load.to = "supply"
	Resistance      si.TolResistance
	Inductance      si.TolInductance
	TorqueConstant  si.TolTorqueConstant
	StaticTorque    si.TolTorque
	CoulombTorque   si.TolTorque
	ViscousTorque   si.TolViscousTorque
	QuadraticTorque si.TolQuadraticTorque
	BrushDrop       si.TolVoltage
	Inertia         si.TolInertia
	MaxCurrent      *si.Current // rating, continuous; nil: the part's, if any
	MaxPower        *si.Power   // rating, heat in the winding; nil: the part's, if any
}

// UsesPot tells whether one of the resistors is the bench's pot.
func (t Timing) UsesPot() bool {
	return t.Charge.Pot || t.Discharge.Pot || t.Common.Pot || t.Track.Pot
}
