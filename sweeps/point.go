package sweeps

import (
	"time"

	"nightbench/instruments/si"
)

// Setpoint is one combination of settings, in the order it is visited.
// Index counts from 0 over the whole plan and is unique in a run.
type Setpoint struct {
	Index     int       `json:"index"`
	Supply    float64   `json:"supply_voltage"` // V, as set
	PotCode   int       `json:"pot_code"`
	Pot       float64   `json:"pot_resistance"`         // Ω, of the code: what is really there; network wiper: of the track's share that charges
	Position  float64   `json:"pot_position,omitempty"` // network wiper: share of the track, of the code; 0: no such pot
	Direction Direction `json:"direction"`              // of travel along the innermost axis: up or down
	Pass      int       `json:"pass"`                   // counts passes along the innermost axis, from 0
	Recheck   bool      `json:"recheck,omitempty"`
}

// Flag says in words why a reading deserves distrust. Name is short and fixed ("unsettled"), Words say the likely cause.
type Flag struct {
	Name  string `json:"name"`
	Words string `json:"words"`
}

// Reading is a quantity at a point. Value is nil when a flag says why there is none; then U is nil too.
type Reading struct {
	Quantity Quantity `json:"quantity"`
	Value    *float64 `json:"value"`
	U        *float64 `json:"u"`             // standard uncertainty, in Unit
	DOF      *float64 `json:"dof,omitempty"` // degrees of freedom; nil: infinitely many
	Unit     si.Unit  `json:"unit"`
	Road     string   `json:"road"` // the way it came: "meter average", "scope ch 1"
	Flags    []Flag   `json:"flags"`
	Raw      []string `json:"raw,omitempty"` // replies as received
}

// Measured makes a reading with a value.
func Measured(q Quantity, value, u, dof float64, road string) Reading {
	r := Reading{Quantity: q, Value: &value, U: &u, Unit: q.Unit(), Road: road, Flags: []Flag{}}
	if dof > 0 && dof < 1e9 {
		r.DOF = &dof
	}
	return r
}

// NoValue makes a reading without one; the flag says why.
func NoValue(q Quantity, road string, why Flag) Reading {
	return Reading{Quantity: q, Unit: q.Unit(), Road: road, Flags: []Flag{why}}
}

// Prediction is what the schematic gives: the value at nominal parts and the 95 % interval from the tolerances.
type Prediction struct {
	Value float64 `json:"value"`
	Low   float64 `json:"low"`
	High  float64 `json:"high"`
	Unit  si.Unit `json:"unit"`
}

// Point is a setpoint that was measured. Predictions are those drawn while the run went on, at the measured supply and the actual pot ohms.
type Point struct {
	Setpoint    Setpoint                `json:"setpoint"`
	At          time.Time               `json:"at"`
	Elapsed     float64                 `json:"elapsed"` // s of bench time since the run began
	Readings    []Reading               `json:"readings"`
	Predictions map[Quantity]Prediction `json:"predictions"`
	Flags       []Flag                  `json:"flags"` // of the prediction or the whole point
	Records     []Record                `json:"-"`     // raw waveforms kept; read one by one
}

// Flagged tells whether the point or any of its readings carries a flag.
func (p Point) Flagged() bool {
	for _, r := range p.Readings {
		if len(r.Flags) > 0 {
			return true
		}
	}
	return len(p.Flags) > 0
}

// Reading finds a quantity's reading.
func (p Point) Reading(q Quantity) (Reading, bool) {
	for _, r := range p.Readings {
		if r.Quantity == q {
			return r, true
		}
	}
	return Reading{}, false
}

// Record is one raw waveform kept with a point, as converter codes: volts = code·VoltsPerCode + VoltsAtZero.
type Record struct {
	Node         string  `json:"node"` // "timer_out less common"
	Channel      int     `json:"channel"`
	Start        float64 `json:"start"`    // s from the trigger
	Interval     float64 `json:"interval"` // s
	VoltsPerCode float64 `json:"volts_per_code"`
	VoltsAtZero  float64 `json:"volts_at_zero"`
	Codes        []int16 `json:"codes"`
}

// Curve is a predicted curve along the innermost axis at one supply voltage, for every quantity predicted.
// All slices have the length of Pot. A setpoint that does not oscillate has nulls.
type Curve struct {
	Supply     float64                      `json:"supply_voltage"`
	Pot        []float64                    `json:"pot_resistance"`
	Quantities map[Quantity]CurveOfQuantity `json:"quantities"`
}

// CurveOfQuantity is one quantity's line and its 95 % band.
type CurveOfQuantity struct {
	Unit  si.Unit    `json:"unit"`
	Value []*float64 `json:"value"`
	Low   []*float64 `json:"low"`
	High  []*float64 `json:"high"`
}
