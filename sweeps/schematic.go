package sweeps

import (
	"fmt"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// Schematic is a board as it is drawn: nodes in falling potential, and what
// stands between them.
type Schematic struct {
	Nodes []SchematicNode `json:"nodes"`
	Parts []SchematicPart `json:"parts"`
}

// SchematicNode is a line of the drawing. An inner one joins two parts of a
// branch; no instrument of a bench file can be named there.
type SchematicNode struct {
	Name  string   `json:"name"`
	Inner bool     `json:"inner,omitempty"`
	Also  []string `json:"also,omitempty"` // names of a bench file for the same node: a current meter parts them
}

// SchematicPart is a part of the drawing. The first terminal of a diode is its
// anode; a transistor's are collector or drain, emitter or source, base or gate.
type SchematicPart struct {
	Name      string     `json:"name"` // the board file's key, as in sensitivities: "charge"
	Kind      string     `json:"kind"` // resistor, pot, capacitor, diode, timer, npn, darlington, nmos, motor, source
	Value     string     `json:"value"`
	Tolerance string     `json:"tolerance,omitempty"` // "1 %", "1 % normal"
	Written   string     `json:"written,omitempty"`   // as the board file has it
	Terminals []Terminal `json:"terminals"`
}

// Terminal is where a part meets a node.
type Terminal struct {
	Node string `json:"node"`
	Pin  string `json:"pin,omitempty"` // the timer's pins
}

const (
	supplyNode    = string(instruments.NodeSupply)
	loadLow       = string(instruments.NodeLoadLow)
	timerOut      = string(instruments.NodeTimerOut)
	capacitorNode = string(instruments.NodeCapacitor)
	dischargeNode = string(instruments.NodeDischarge)
	controlNode   = string(instruments.NodeControl)
	commonNode    = string(instruments.NodeCommon)
)

// Lines are drawn in falling potential, as far as a board that swings has one.
var (
	falling = []string{
		supplyNode, loadLow, "charge_stop", dischargeNode, "pot_up", "charge_end", "discharge_stop", "pot_down", "discharge_end",
		capacitorNode, controlNode, timerOut, "base", "gate", commonNode,
	}
	fallingFromOutput = []string{
		supplyNode, loadLow, timerOut, "common_stop", "branch", "charge_stop", "charge_end", "discharge_stop", "discharge_end",
		capacitorNode, controlNode, "base", "gate", commonNode,
	}
)

// Schematic lays the board out. Which part lies where follows from the network
// and the stage; values are the board file's.
func (b Board) Schematic() Schematic {
	d := draft{board: b, file: userfile.Reopen(b.Path, b.Text)}
	d.timer()
	d.timing()
	d.driver()
	d.load()
	return Schematic{Nodes: d.nodes(), Parts: d.parts}
}

// draft collects the parts of a drawing.
type draft struct {
	board Board
	file  *userfile.File
	parts []SchematicPart
}

func (d *draft) put(p SchematicPart, nodes ...string) {
	for _, n := range nodes {
		p.Terminals = append(p.Terminals, Terminal{Node: n})
	}
	d.parts = append(d.parts, p)
}

// nodes are those that a part meets, in order.
func (d *draft) nodes() []SchematicNode {
	met := map[string]bool{}
	for _, p := range d.parts {
		for _, t := range p.Terminals {
			met[t.Node] = true
		}
	}
	order := falling
	if d.board.Timing.Network == OutputFed {
		order = fallingFromOutput
	}
	named := map[string]bool{}
	for _, n := range instruments.Nodes {
		named[string(n)] = true
	}
	var all []SchematicNode
	for _, name := range order {
		if met[name] {
			all = append(all, SchematicNode{Name: name, Inner: !named[name], Also: d.also(name)})
		}
	}
	return all
}

// also are a bench file's other names for a node: those of the load's terminals.
func (d *draft) also(name string) []string {
	high, low := d.loadBetween()
	var also []string
	if name == high {
		also = append(also, string(instruments.NodeFlybackTop), string(instruments.NodeLoadHigh))
	}
	if name == low && low != loadLow {
		also = append(also, loadLow)
	}
	return also
}

func (d *draft) loadBetween() (high, low string) {
	switch l := &d.board.Load; {
	case d.board.Driver.Stage != StageNone:
		return supplyNode, loadLow
	case l.ToSupply:
		return supplyNode, timerOut
	}
	return timerOut, commonNode
}

// written is a key's text in the board file; empty where it is no text.
func (d *draft) written(table, key string) (text string) {
	if t := d.file.Table(table).Optional(); !t.IsTable(key) && !t.IsNumber(key) {
		t.String(key, &text)
	}
	return text
}

// tolerant is a quantity with a tolerance, whatever its dimension.
type tolerant interface {
	Spread() (nominal, tolerance float64, normal bool)
}

// valued is a part with its value and tolerance in words.
func (d *draft) valued(name, kind, table string, v tolerant, unit si.Unit) SchematicPart {
	nominal, tolerance, normal := v.Spread()
	p := SchematicPart{Name: name, Kind: kind, Value: si.Format(nominal, unit), Written: d.written(table, name)}
	if tolerance > 0 {
		p.Tolerance = fmt.Sprintf("%.6g\u00a0%%", 100*tolerance)
		if normal {
			p.Tolerance += " normal"
		}
	}
	return p
}

func (d *draft) diodePart(name, table string, v Diode) SchematicPart {
	p := SchematicPart{Name: name, Kind: "diode", Value: v.Name, Written: d.written(table, name)}
	if v.Name == "" {
		p.Value = fmt.Sprintf("Is %s, n %.4g, Rs %s", si.Format(v.Is, si.Ampere), v.N, si.Format(v.Rs, si.Ohm))
	}
	return p
}

// stage names the transistor, or its parameters where they stand in the file.
func (v Transistor) words(s Stage) string {
	switch {
	case v.Name != "":
		return v.Name
	case s == StageNMOS:
		return fmt.Sprintf("Rds %s, Vgs %s", si.Format(v.RdsOn, si.Ohm), si.Format(v.VgsTh, si.Volt))
	}
	return strings.Join([]string{"Vbe " + si.Format(v.VBE, si.Volt), "Vce " + si.Format(v.VCESat, si.Volt), fmt.Sprintf("hFE %.4g", v.HFEMin)}, ", ")
}
