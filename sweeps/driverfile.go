package sweeps

import (
	"fmt"

	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// driver reads the output stage.
func driver(t *userfile.Table, v *Driver) {
	v.Flyback.None = true
	if t.Has("flyback") {
		diode(t, "flyback", &v.Flyback)
	} else {
		t.Known("flyback")
	}
	if !userfile.Word(t, "stage", &v.Stage, StageNone, StageNPN, StageDarlington, StageNMOS) {
		t.Known("part", "base_resistor", "gate_resistor")
		return
	}
	useless := func(key string) { t.Refuse(key, fmt.Sprintf("stage %q has no use for it", v.Stage)) }
	switch v.Stage {
	case StageNone:
		useless("part")
		useless("base_resistor")
		useless("gate_resistor")
	case StageNPN, StageDarlington:
		transistor(t, &v.Part, v.Stage)
		v.BaseResistor = &si.TolResistance{}
		signed(t, "base_resistor", v.BaseResistor, positive)
		useless("gate_resistor")
	case StageNMOS:
		transistor(t, &v.Part, v.Stage)
		v.GateResistor = override[si.TolResistance](t, "gate_resistor", notNegative)
		useless("base_resistor")
	}
}

// transistor reads a catalogue name, or { vbe, vce_sat, hfe_min } or { rds_on, vgs_th }.
func transistor(t *userfile.Table, v *Transistor, s Stage) {
	if !t.IsTable("part") {
		t.String("part", &v.Name)
		return
	}
	in := t.Table("part")
	if s == StageNMOS {
		parameter[si.Resistance](in, "rds_on", &v.RdsOn, positive)
		parameter[si.Voltage](in, "vgs_th", &v.VgsTh, positive)
		return
	}
	parameter[si.Voltage](in, "vbe", &v.VBE, positive)
	parameter[si.Voltage](in, "vce_sat", &v.VCESat, notNegative)
	parameter[si.Ratio](in, "hfe_min", &v.HFEMin, positive)
}

// motorKeys are the keys of [load] that only a motor has.
var motorKeys = []string{"part", "inductance", "torque_constant", "static_torque", "coulomb_torque", "viscous_torque", "quadratic_torque", "brush_drop", "inertia"}

// load reads what the board drives. Torques, brush drop and inertia that are
// left out are zero, the static torque that of friction: an inertia of zero
// means that none is known. With a catalogue motor they are the part's.
func load(t *userfile.Table, v *Load, s Stage) {
	t.Known(motorKeys...)
	kind := userfile.Word(t, "kind", &v.Kind, Motor, ResistorLoad)
	to := "ground"
	switch {
	case s == StageNone:
		userfile.Word(t.Optional(), "to", &to, "ground", "supply")
	case s != "":
		t.Refuse("to", fmt.Sprintf("with stage %q the load always goes to the supply; leave the line out", s))
	default:
		t.Known("to")
	}
	v.ToSupply = to == "supply"
	v.MaxCurrent = override[si.Current](t, "max_current", positive)
	v.MaxPower = override[si.Power](t, "max_power", positive)
	switch {
	case kind && v.Kind == Motor:
		motor(t, v)
	case kind:
		signed(t, "resistance", &v.Resistance, positive)
		for _, key := range motorKeys {
			t.Refuse(key, `a load of kind "resistor" has no use for it`)
		}
	default:
		t.Known("resistance")
	}
}

func motor(t *userfile.Table, v *Load) {
	o, may := t.Optional(), notNegative
	if o.String("part", &v.Part) {
		t, may = o, positive // zero is for what is the part's
	}
	signed(t, "resistance", &v.Resistance, positive)
	signed(t, "inductance", &v.Inductance, positive)
	signed(t, "torque_constant", &v.TorqueConstant, positive)
	signed(o, "coulomb_torque", &v.CoulombTorque, may)
	signed(o, "viscous_torque", &v.ViscousTorque, may)
	signed(o, "quadratic_torque", &v.QuadraticTorque, may)
	signed(o, "brush_drop", &v.BrushDrop, may)
	signed(o, "inertia", &v.Inertia, positive)
	if !signed(o, "static_torque", &v.StaticTorque, may) && v.Part == "" {
		v.StaticTorque = v.CoulombTorque
	}
	if v.Part != "" && !t.Has("static_torque") {
		return
	}
	if v.StaticTorque.SI() < v.CoulombTorque.SI() {
		t.Fail("static_torque", "can't be below the coulomb torque, "+v.CoulombTorque.String()+": what turns a standing motor keeps it turning")
	}
}
