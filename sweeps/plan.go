package sweeps

import (
	"time"

	"nightbench/instruments/si"
)

// Plan is a plan file: what to step through, what to measure, when to stop.
type Plan struct {
	Name      string
	BoardPath string          // resolved against the plan's folder
	AtMost    time.Duration   // bench time; zero: no limit stated
	SafeBy    string          // "07:00", local wall time; empty: none
	Attended  string          // who attends and until when; empty: unattended
	Ambient   *si.Temperature // about the board, what the run is predicted for; nil: not measured
	Axes      []Axis          // outermost first
	WarmUp    *WarmUp
	Settle    Settle
	Measure   Measure
	Trips     []Trip
	Recheck   *Recheck
	Accept    map[Quantity]si.Limit

	Path string // file it was read from
	Text string // verbatim
}

// Setting is what an axis sets.
type Setting string

// What can be set.
const (
	SetSupplyVoltage Setting = "supply_voltage"
	SetPotResistance Setting = "pot_resistance"
	SetPotCode       Setting = "pot_code"
	SetPotPosition   Setting = "pot_position"
	SetTimerOutput   Setting = "timer_output"
)

// Direction is the order of travel along an axis.
type Direction string

// The directions.
const (
	Up       Direction = "up"
	Down     Direction = "down"
	Both     Direction = "both"
	Shuffled Direction = "shuffled"
)

// Axis is one thing that is stepped. Values are in SI (Ω, V, code number, share of the track),
// in the order written or, from From, To, Points and Spacing, already spread.
type Axis struct {
	Set       Setting
	Values    []float64
	Direction Direction
	Line      int // of its table in the plan file, for messages
}

// Held are settings at which something is done.
type Held struct {
	Supply   si.Voltage
	Pot      si.Resistance
	Position si.Ratio // network wiper, in place of Pot: share of the track in the charging path
}

// WarmUp is a spell at one setting before the first point.
type WarmUp struct {
	At  Held
	For time.Duration
}

// Settle says when a setpoint has settled.
type Settle struct {
	Watch  Quantity
	Steady float64 // relative change over the window
	AtMost time.Duration
}

// Measure says what is measured at a setpoint.
type Measure struct {
	Quantities   []Quantity
	Repeats      int
	KeepWaveform int // every Nth point; 0 never, 1 always
}

// Trip is a limit that ends a run: |quantity| above Limit for longer than For.
type Trip struct {
	Quantity Quantity
	Limit    float64 // SI
	For      time.Duration
}

// Recheck is a return to one setting every so many points, to tell drift from effect.
type Recheck struct {
	Every int
	At    Held
	Limit float64 // relative
}
