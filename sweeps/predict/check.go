package predict

import (
	"fmt"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// check refuses a board that cannot work whatever the setpoint; the words name nodes and numbers.
func (m *Model) check() error {
	for _, test := range []func() error{m.checkParts, m.checkNetwork, m.checkStage, m.checkLoad, m.checkMeans} {
		if err := test(); err != nil {
			return fmt.Errorf("board %q: %w", m.board.Name, err)
		}
	}
	return nil
}

// checkParts refuses negative parts, also where a tolerance reaches below zero.
func (m *Model) checkParts() error {
	for _, v := range m.variables {
		if v.low < 0 || !(v.typical >= 0) {
			return fmt.Errorf("%s: %s is negative", v.name, show(min(v.low, v.typical), v.unit))
		}
	}
	if m.nominal.capacitor == 0 {
		return fmt.Errorf("timing.capacitor is missing: node X has nothing to charge")
	}
	th, ratio := m.nominal.timer.threshold, m.nominal.timer.triggerRatio
	if th >= 1 || ratio >= 1 {
		return fmt.Errorf("timer: threshold %.3f and trigger %.3f of the supply: the trigger must lie below the threshold, and both below 1", th, th*ratio)
	}
	return nil
}

// checkNetwork refuses a network one of whose phases has no path, or no resistance.
func (m *Model) checkNetwork() error {
	t, p := &m.board.Timing, &m.nominal
	up, down := p.chargeDiode.is > 0, p.dischargeDiode.is > 0
	ra := p.charge > 0 || t.Charge.Pot
	rb := p.discharge > 0 || t.Discharge.Pot
	if t.Network != sweeps.OutputFed && !ra {
		return fmt.Errorf("timing.charge is missing: node Q would be shorted to the supply S by the discharge pin")
	}
	switch t.Network {
	case sweeps.Plain:
		if up || down {
			return fmt.Errorf("network plain has no diodes; bypassed or steered have")
		}
	case sweeps.Bypassed:
		if !up || down {
			return fmt.Errorf("network bypassed has one diode, charge_diode from Q to X across timing.discharge")
		}
	case sweeps.Steered:
		if !up {
			return fmt.Errorf("network steered needs its charge_diode: without it Q and X are one node and timing.discharge is bridged")
		}
	case sweeps.Wiper:
		if t.Track.Pot && p.track == 0 {
			return fmt.Errorf("timing.pot is the bench's pot, whose ohms end to end are not known here; name the bench file, or write the ohms into the board file")
		}
		if p.track == 0 {
			return fmt.Errorf("network wiper needs timing.pot, ohms end to end")
		}
		if !up && !down {
			return fmt.Errorf("network wiper needs at least one diode, else both ends of the pot meet at X and its position does nothing")
		}
		return nil
	case sweeps.OutputFed:
		if p.common == 0 && !t.Common.Pot && !(ra && rb) {
			return fmt.Errorf("network output-fed: the capacitor X would be tied to the output O without resistance; give timing.common, or both charge and discharge")
		}
		return nil
	default:
		return fmt.Errorf("network %q is not known; use plain, bypassed, steered, wiper or output-fed", t.Network)
	}
	if !rb {
		return fmt.Errorf("timing.discharge is missing: X would be discharged through the discharge pin without resistance")
	}
	return nil
}

func (m *Model) checkStage() error {
	d, p := &m.board.Driver, &m.nominal
	switch d.Stage {
	case sweeps.StageNone:
		return nil
	case sweeps.StageNPN, sweeps.StageDarlington:
		if p.switchPart.base == 0 {
			return fmt.Errorf("driver.base_resistor is missing: the timer's output O would drive the base without limit")
		}
	case sweeps.StageNMOS:
	default:
		return fmt.Errorf("stage %q is not known; use none, npn, darlington or nmos", d.Stage)
	}
	return m.checkTurnsOn()
}

// checkTurnsOn computes the timer's high level at the highest rated supply: below
// the transistor's threshold there it is never on.
func (m *Model) checkTurnsOn() error {
	supply := m.board.RatedSupply[1].SI()
	if supply <= 0 {
		supply = m.rated.timer.MaxSupply.Typical
	}
	if supply <= 0 {
		return nil
	}
	p := m.nominal
	m.warm(&p, reference)
	out := output{supply, m.drop, m.low, p.timer.dropScale, p.timer.lowScale, 0, false, 0}
	d := m.control(&p, &out, 0)
	if m.on(&p, &d) {
		return nil
	}
	high, _ := out.high(0)
	need := p.switchPart.vbe
	if m.board.Driver.Stage == sweeps.StageNMOS {
		need = p.switchPart.vgsTh
	}
	return fmt.Errorf("driver: the %s never turns on: output O reaches %s on %s, it needs more than %s",
		m.board.Driver.Stage, show(high, si.Volt), show(supply, si.Volt), show(need, si.Volt))
}

func (m *Model) checkLoad() error {
	l := &m.nominal.load
	switch {
	case l.r == 0:
		return fmt.Errorf("load.resistance is missing: the load would short the driver")
	case m.board.Load.Kind == sweeps.Motor && l.k == 0:
		return fmt.Errorf("load.torque_constant is missing: a motor needs one")
	case m.board.Load.Kind != sweeps.Motor && l.k > 0:
		return fmt.Errorf("load.torque_constant is given, but the load is a %s", m.board.Load.Kind)
	case m.board.Load.ToSupply && m.board.Driver.Stage != sweeps.StageNone:
		return fmt.Errorf("load.to is for stage none; behind a transistor the load stands between supply and collector or drain")
	case l.k > 0 && l.static > 0 && l.static < l.coulomb:
		return fmt.Errorf("load.static_torque %s is below coulomb_torque %s: what stands is never easier to move than what turns", show(l.static, si.NewtonMetre), show(l.coulomb, si.NewtonMetre))
	}
	return nil
}

// checkMeans drives the load without a pause at the lowest rated supply: what is
// beyond its driver there is so at every setpoint.
func (m *Model) checkMeans() error {
	supply := m.board.RatedSupply[0].SI()
	if supply <= 0 {
		return nil
	}
	c := conditions{supply: supply, pot: 0.5, kelvin: reference, held: HeldHigh}
	name, limit := string(m.board.Driver.Stage), m.rated.transistor.MaxCurrent.Typical
	if m.board.Driver.Stage == sweeps.StageNone {
		name, limit = "timer's output O", m.rated.timer.MaxOutputCurrent.Typical
		if m.board.Load.ToSupply {
			c.held = HeldLow
		}
	}
	o := m.solve(&m.nominal, c)
	switch {
	case o.starved:
		return fmt.Errorf("load: on %s already it would draw %s, but %s into the base lets the %s carry %s; lower driver.base_resistor",
			show(supply, si.Volt), show(o.wave.peak, si.Ampere), show(o.base, si.Ampere), name, show(m.nominal.switchPart.gain()*o.base, si.Ampere))
	case limit > 0 && o.wave.peak > limit:
		return fmt.Errorf("load: on %s already it draws %s, more than the %s the %s may carry",
			show(supply, si.Volt), show(o.wave.peak, si.Ampere), show(limit, si.Ampere), name)
	}
	return nil
}
