package predict

import (
	"fmt"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// resolve turns the board file's parts, catalogue names and overrides into variables.
func (m *Model) resolve(c *Catalogue) error {
	if err := m.resolveTimer(c); err != nil {
		return fmt.Errorf("timer.part: %w", err)
	}
	m.resolveTiming()
	if err := m.resolveDiodes(c); err != nil {
		return err
	}
	if err := m.resolveSwitch(c); err != nil {
		return fmt.Errorf("driver.part: %w", err)
	}
	if err := m.resolveLoad(c); err != nil {
		return fmt.Errorf("load.part: %w", err)
	}
	return nil
}

func (m *Model) resolveTiming() {
	t, p := &m.board.Timing, &m.nominal
	p.pot = 1
	p.wiper = m.o.WiperResistance
	fitted := func(name string, r sweeps.Resistor, at func(*parts) *float64) {
		if !r.Pot && r.Value.SI() != 0 {
			m.vary(name, si.Ohm, spreadOf(r.Value), at)
		}
	}
	fitted("charge", t.Charge, func(p *parts) *float64 { return &p.charge })
	fitted("discharge", t.Discharge, func(p *parts) *float64 { return &p.discharge })
	fitted("common", t.Common, func(p *parts) *float64 { return &p.common })
	if t.Network == sweeps.Wiper && t.Track.Pot {
		m.vary("pot", si.Ohm, spreadOf(m.o.Track), func(p *parts) *float64 { return &p.track })
	} else {
		fitted("pot", t.Track, func(p *parts) *float64 { return &p.track })
		if t.UsesPot() {
			m.vary("pot", si.One, tolerance(1, m.o.PotTolerance, false), func(p *parts) *float64 { return &p.pot })
		}
	}
	for _, s := range []struct {
		name string
		r    si.TolResistance
		at   func(*parts) *float64
	}{
		{"stop", t.Stop, func(p *parts) *float64 { return &p.stop }},
		{"stop_up", t.StopUp, func(p *parts) *float64 { return &p.stopUp }},
		{"stop_down", t.StopDown, func(p *parts) *float64 { return &p.stopDown }},
	} {
		if s.r.SI() != 0 {
			m.vary(s.name, si.Ohm, spreadOf(s.r), s.at)
		}
	}
	m.vary("leak_resistance", si.Ohm, exactly(0), func(p *parts) *float64 { return &p.leak })
	m.vary("capacitor", si.Farad, spreadOf(t.Capacitor), func(p *parts) *float64 { return &p.capacitor })
}

func (m *Model) resolveDiodes(c *Catalogue) error {
	for _, d := range []struct {
		key   string
		board sweeps.Diode
		at    func(*parts) *diode
		rated *DiodePart
	}{
		{"charge_diode", m.board.Timing.ChargeDiode, func(p *parts) *diode { return &p.chargeDiode }, &m.rated.charge},
		{"discharge_diode", m.board.Timing.DischargeDiode, func(p *parts) *diode { return &p.dischargeDiode }, &m.rated.discharge},
		{"flyback", m.board.Driver.Flyback, func(p *parts) *diode { return &p.fb }, &m.rated.flyback},
	} {
		if !fittedDiode(d.board) {
			continue
		}
		part, err := diodePart(c, d.board)
		if err != nil {
			return fmt.Errorf("%s: %w", d.key, err)
		}
		*d.rated = part
		fixedPart := d.at(&m.nominal)
		fixedPart.eg, fixedPart.xti = part.Eg, part.Xti
		m.vary(d.key+".is", si.Ampere, part.Is.spread(), func(p *parts) *float64 { return &d.at(p).is })
		m.vary(d.key+".n", si.One, part.N.spread(), func(p *parts) *float64 { return &d.at(p).n })
		m.vary(d.key+".rs", si.Ohm, part.Rs.spread(), func(p *parts) *float64 { return &d.at(p).rs })
		if part.Shunt.Typical > 0 {
			m.vary(d.key+".shunt", si.Ohm, part.Shunt.spread(), func(p *parts) *float64 { return &d.at(p).shunt })
		}
	}
	return nil
}

func fittedDiode(d sweeps.Diode) bool { return !d.None && (d.Name != "" || d.Is != 0) }

// diodePart is the catalogue's, or an inline one. An inline diode of more than
// 100 nA is taken for a Schottky (barrier 0.69 eV), any other for silicon (1.11 eV).
func diodePart(c *Catalogue, d sweeps.Diode) (DiodePart, error) {
	if d.Name != "" {
		return find("diode", d.Name, c.Diodes, func(p DiodePart) string { return p.Name })
	}
	p := DiodePart{Name: "inline", Is: Figure{Typical: d.Is}, N: Figure{Typical: d.N}, Rs: Figure{Typical: d.Rs}, Eg: 1.11, Xti: 3}
	if d.Is > 1e-7 {
		p.Eg, p.Xti = 0.69, 2
	}
	return p, p.check()
}

// resolveLoad takes the load's figures from the board file, and what stands not
// there from the catalogue motor, if it names one.
func (m *Model) resolveLoad(c *Catalogue) error {
	l, part := &m.board.Load, MotorPart{}
	if l.Part != "" {
		var err error
		if part, err = find("motor", l.Part, c.Motors, func(p MotorPart) string { return p.Name }); err != nil {
			return err
		}
	}
	m.rateLoad(part)
	coulomb := ownOr(l.CoulombTorque, part.CoulombTorque.spread())
	static := part.StaticTorque.spread()
	if l.Part != "" && static.typical == 0 {
		static = coulomb // what is known to be needed
	}
	for _, v := range []struct {
		name string
		unit si.Unit
		spread
		at func(*parts) *float64
	}{
		{"load.resistance", si.Ohm, ownOr(l.Resistance, part.Resistance.spread()), func(p *parts) *float64 { return &p.load.r }},
		{"load.inductance", si.Henry, ownOr(l.Inductance, part.Inductance.spread()), func(p *parts) *float64 { return &p.load.l }},
		{"load.torque_constant", si.VoltSecPerRad, ownOr(l.TorqueConstant, part.TorqueConstant.spread()), func(p *parts) *float64 { return &p.load.k }},
		{"load.static_torque", si.NewtonMetre, ownOr(l.StaticTorque, static), func(p *parts) *float64 { return &p.load.static }},
		{"load.coulomb_torque", si.NewtonMetre, coulomb, func(p *parts) *float64 { return &p.load.coulomb }},
		{"load.viscous_torque", si.NewtonMetreSec, ownOr(l.ViscousTorque, part.ViscousTorque.spread()), func(p *parts) *float64 { return &p.load.viscous }},
		{"load.quadratic_torque", si.NewtonMetreSq, ownOr(l.QuadraticTorque, part.QuadraticTorque.spread()), func(p *parts) *float64 { return &p.load.quad }},
		{"load.brush_drop", si.Volt, ownOr(l.BrushDrop, part.BrushDrop.spread()), func(p *parts) *float64 { return &p.load.brush }},
		{"load.inertia", si.KilogramMetre2, ownOr(l.Inertia, part.Inertia.spread()), func(p *parts) *float64 { return &p.load.inertia }},
	} {
		if v.typical != 0 {
			m.vary(v.name, v.unit, v.spread, v.at)
		}
	}
	return nil
}

// ownOr is the board file's figure where it gives one.
func ownOr(own toleranced, part spread) spread {
	if nominal, _, _ := own.Spread(); nominal != 0 {
		return spreadOf(own)
	}
	return part
}

// rateLoad takes the load's ratings from the board file, or the part's.
func (m *Model) rateLoad(part MotorPart) {
	l, r := &m.board.Load, &m.rated.load
	r.current, r.power = part.MaxCurrent.Typical, part.MaxPower.Typical
	if l.MaxCurrent != nil {
		r.current = l.MaxCurrent.SI()
	}
	if l.MaxPower != nil {
		r.power = l.MaxPower.SI()
	}
}
