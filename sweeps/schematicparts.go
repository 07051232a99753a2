package sweeps

import (
	"nightbench/instruments/si"
)

// timer puts the chip with its pins.
func (d *draft) timer() {
	p := SchematicPart{Name: "timer", Kind: "timer", Value: d.board.Timer.Part, Written: d.written("timer", "part")}
	pins := []Terminal{{supplyNode, "8"}}
	if d.board.Timing.Network != OutputFed {
		pins = append(pins, Terminal{dischargeNode, "7"})
	}
	pins = append(pins, Terminal{capacitorNode, "6, 2"})
	if d.board.Timing.Control != nil {
		pins = append(pins, Terminal{controlNode, "5"})
	}
	p.Terminals = append(pins, Terminal{timerOut, "3"}, Terminal{commonNode, "1"})
	d.parts = append(d.parts, p)
	if c := d.board.Timing.Control; c != nil {
		words := si.Format(c.Voltage.SI(), si.Volt)
		if c.Resistance.SI() > 0 {
			words += " through " + si.Format(c.Resistance.SI(), si.Ohm)
		}
		d.put(SchematicPart{Name: "control", Kind: "source", Value: words}, controlNode, commonNode)
	}
}

// timing puts the network's parts (docs: nodes and networks).
func (d *draft) timing() {
	t := &d.board.Timing
	switch t.Network {
	case OutputFed:
		d.fromOutput()
	case Wiper:
		d.resistor("charge", t.Charge, supplyNode, dischargeNode, "charge_stop")
		d.track()
	default:
		d.resistor("charge", t.Charge, supplyNode, dischargeNode, "charge_stop")
		d.chargeDiode(dischargeNode)
		end := capacitorNode
		if fitted(t.DischargeDiode) {
			end = "discharge_end"
			d.dischargeDiode(end)
		}
		d.resistor("discharge", t.Discharge, dischargeNode, end, "discharge_stop")
	}
	d.put(d.valued("capacitor", "capacitor", "timing", t.Capacitor, si.Farad), capacitorNode, commonNode)
}

// fromOutput is charged and discharged by the timer's output.
func (d *draft) fromOutput() {
	t := &d.board.Timing
	if !fitted(t.ChargeDiode) && !fitted(t.DischargeDiode) {
		d.resistor("common", t.Common, timerOut, capacitorNode, "common_stop")
		return
	}
	branch := timerOut
	if t.Common.Pot || t.Common.SI() > 0 {
		branch = "branch"
		d.resistor("common", t.Common, timerOut, branch, "common_stop")
	}
	d.resistor("charge", t.Charge, branch, "charge_end", "charge_stop")
	d.chargeDiode("charge_end")
	d.resistor("discharge", t.Discharge, branch, "discharge_end", "discharge_stop")
	d.dischargeDiode("discharge_end")
}

// track is a pot in the network with its wiper on the discharge pin.
func (d *draft) track() {
	t := &d.board.Timing
	up, down := "charge_end", "discharge_end"
	if t.StopUp.SI() > 0 {
		d.put(d.valued("stop_up", "resistor", "timing", t.StopUp, si.Ohm), "pot_up", up)
		up = "pot_up"
	}
	if t.StopDown.SI() > 0 {
		d.put(d.valued("stop_down", "resistor", "timing", t.StopDown, si.Ohm), down, "pot_down")
		down = "pot_down"
	}
	p := SchematicPart{Name: "pot", Kind: "pot", Value: "the bench’s"}
	if !t.Track.Pot {
		p = d.valued("pot", "pot", "timing", t.Track.Value, si.Ohm)
	}
	d.put(p, up, down, dischargeNode)
	d.chargeDiode("charge_end")
	d.dischargeDiode("discharge_end")
}

func fitted(v Diode) bool { return !v.None && (v.Name != "" || v.Is != 0) }

func (d *draft) chargeDiode(from string) {
	if v := d.board.Timing.ChargeDiode; fitted(v) {
		d.put(d.diodePart("charge_diode", "timing", v), from, capacitorNode)
	}
}

func (d *draft) dischargeDiode(to string) {
	if v := d.board.Timing.DischargeDiode; fitted(v) {
		d.put(d.diodePart("discharge_diode", "timing", v), capacitorNode, to)
	}
}

// resistor puts a fixed resistor, or the bench's pot with its stop; joint is the node between those two.
func (d *draft) resistor(name string, r Resistor, from, to, joint string) {
	if !r.Pot {
		if r.SI() > 0 {
			d.put(d.valued(name, "resistor", "timing", r.Value, si.Ohm), from, to)
		}
		return
	}
	if stop := d.board.Timing.Stop; stop.SI() > 0 {
		d.put(d.valued("stop", "resistor", "timing", stop, si.Ohm), joint, to)
		to = joint
	}
	d.put(SchematicPart{Name: "pot", Kind: "pot", Value: "the bench’s", Written: d.written("timing", name)}, from, to)
}

// driver puts the transistor, what feeds it, and the flyback diode.
func (d *draft) driver() {
	v := &d.board.Driver
	high, low := d.loadBetween()
	if fitted(v.Flyback) {
		d.put(d.diodePart("flyback", "driver", v.Flyback), low, high)
	}
	if v.Stage == StageNone {
		return
	}
	input := timerOut
	switch {
	case v.BaseResistor != nil && v.BaseResistor.SI() > 0:
		input = "base"
		d.put(d.valued("base_resistor", "resistor", "driver", v.BaseResistor, si.Ohm), timerOut, input)
	case v.GateResistor != nil && v.GateResistor.SI() > 0:
		input = "gate"
		d.put(d.valued("gate_resistor", "resistor", "driver", v.GateResistor, si.Ohm), timerOut, input)
	}
	p := SchematicPart{Name: "transistor", Kind: string(v.Stage), Value: v.Part.words(v.Stage), Written: d.written("driver", "part")}
	d.put(p, loadLow, commonNode, input)
}

// load puts what the board drives.
func (d *draft) load() {
	l := &d.board.Load
	high, low := d.loadBetween()
	p := d.valued("resistance", string(l.Kind), "load", l.Resistance, si.Ohm)
	if l.Part != "" && l.Resistance.SI() == 0 {
		p.Value, p.Written = l.Part, d.written("load", "part")
	}
	p.Name = "load"
	d.put(p, high, low)
}
