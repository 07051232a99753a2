package instruments

import "nightbench/instruments/si"

// Node is a place on the board where an instrument is connected.
type Node string

// The nodes a bench file may name.
const (
	NodeSupply     Node = "supply"
	NodeBoard      Node = "board"
	NodeTimerOut   Node = "timer_out"
	NodeCapacitor  Node = "capacitor"
	NodeDischarge  Node = "discharge"
	NodeControl    Node = "control"
	NodeLoadHigh   Node = "load_hi"
	NodeLoadLow    Node = "load_lo"
	NodeFlybackTop Node = "flyback_top"
	NodeSense      Node = "sense"
	NodeCommon     Node = "common"
	NodeEarth      Node = "earth"
)

// Nodes lists every node, in falling potential.
var Nodes = []Node{NodeSupply, NodeBoard, NodeFlybackTop, NodeLoadHigh, NodeLoadLow, NodeTimerOut, NodeControl, NodeCapacitor, NodeDischarge, NodeSense, NodeCommon, NodeEarth}

// Between is a pair of nodes; what is measured is the first less the second.
type Between [2]Node

// Wiring says how the instruments are wired to the board and what they may do.
// It is plain data: everything that turns replies into readings needs no more.
type Wiring struct {
	Bench    string        `json:"bench"`
	Practice bool          `json:"practice"` // simulated instruments
	Supply   SupplyWiring  `json:"supply"`
	Meters   []MeterWiring `json:"meters"`
	Scope    *ScopeWiring  `json:"scope,omitempty"` // nil: no scope on this bench
	Pot      *PotWiring    `json:"pot,omitempty"`   // nil: no pot on this bench
}

// SupplyWiring is the supply's share of the bench file.
type SupplyWiring struct {
	Between     Between `json:"between"`
	MaxVoltage  float64 `json:"max_voltage"`  // V, never exceeded whatever a plan says
	MaxCurrent  float64 `json:"max_current"`  // A
	OverVoltage float64 `json:"over_voltage"` // V, set in the instrument itself
	Fuse        float64 `json:"fuse"`         // A, 0 where none is stated
}

// MeterWiring is one meter's share of the bench file.
type MeterWiring struct {
	Name            string    `json:"name"`
	Reads           string    `json:"reads"` // a quantity's name
	Between         Between   `json:"between"`
	Burden          float64   `json:"burden"`             // Ω in series, for current
	InputResistance float64   `json:"input_resistance"`   // Ω, 0 where not stated
	Accuracy        *Accuracy `json:"accuracy,omitempty"` // overrides the dialect's figure
	Calibrated      string    `json:"calibrated"`         // date, ISO 8601
	Due             string    `json:"due"`
}

// ScopeWiring is the scope's share of the bench file.
type ScopeWiring struct {
	Earthed  bool                 `json:"earthed"`
	Channels []ScopeChannelWiring `json:"channels"`
}

// ScopeChannelWiring says what one channel looks at.
type ScopeChannelWiring struct {
	Number  int     `json:"number"`
	Between Between `json:"between"`
	Probe   float64 `json:"probe"`
}

// PotWiring is the pot's share of the bench file.
type PotWiring struct {
	Codes              int     `json:"codes"`      // number of codes, 257 for an 8-bit part of 257 steps
	EndToEnd           float64 `json:"end_to_end"` // Ω
	Tolerance          float64 `json:"tolerance"`  // relative half-width of EndToEnd
	Wiper              float64 `json:"wiper"`      // Ω
	MaxTerminalVoltage float64 `json:"max_terminal_voltage"`
	MaxCurrent         float64 `json:"max_current"`
	Park               int     `json:"park"` // code when safe
}

// Ohms is the resistance at a code: R_AB·D/(codes−1) + R_W.
func (p PotWiring) Ohms(code int) si.Resistance {
	return si.Ohms(p.EndToEnd*float64(code)/float64(p.Codes-1) + p.Wiper)
}

// Position is the share of the track between wiper and terminal A at a code,
// which counts from terminal B: 1 at code 0.
func (p PotWiring) Position(code int) float64 {
	return 1 - float64(code)/float64(p.Codes-1)
}

// Bench is the wiring and the instruments themselves. Meters stand in the order
// of Wiring.Meters. An absent instrument is a null object whose error names the key to add.
type Bench struct {
	Wiring
	Supply Supply
	Meters []Meter
	Scope  Scope
	Pot    Pot
	Cutoff Cutoff
}
