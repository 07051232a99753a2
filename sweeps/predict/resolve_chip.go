package predict

import (
	"fmt"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// resolveTimer takes the catalogue's timer and puts the board file's overrides in its place.
func (m *Model) resolveTimer(c *Catalogue) error {
	t := &m.board.Timer
	part, err := find("timer", t.Part, c.Timers, func(p TimerPart) string { return p.Name })
	if err != nil {
		return err
	}
	m.rated.timer = part
	if t.MaxOutputCurrent != nil {
		m.rated.timer.MaxOutputCurrent = Figure{Typical: t.MaxOutputCurrent.SI()}
	}
	either := func(own toleranced, given bool, part Figure) spread {
		if given {
			return spreadOf(own)
		}
		return part.spread()
	}
	threshold := either(orZero(t.Threshold), t.Threshold != nil, part.Threshold)
	m.vary("threshold", si.One, threshold, func(p *parts) *float64 { return &p.timer.threshold })
	m.vary("trigger_ratio", si.One, triggerRatio(t, part, threshold.typical), func(p *parts) *float64 { return &p.timer.triggerRatio })
	for _, v := range []struct {
		name string
		unit si.Unit
		spread
		at func(*parts) *float64
	}{
		{"trigger_current", si.Ampere, either(orZero(t.TriggerCurrent), t.TriggerCurrent != nil, part.TriggerCurrent), func(p *parts) *float64 { return &p.timer.triggerCurrent }},
		{"threshold_current", si.Ampere, either(orZero(t.ThresholdCurrent), t.ThresholdCurrent != nil, part.ThresholdCurrent), func(p *parts) *float64 { return &p.timer.thresholdCurrent }},
		{"discharge_leakage", si.Ampere, part.DischargeLeakage.spread(), func(p *parts) *float64 { return &p.timer.leakage }},
		{"discharge_offset", si.Volt, either(orZero(t.DischargeOffset), t.DischargeOffset != nil, part.DischargeOffset), func(p *parts) *float64 { return &p.timer.offset }},
		{"discharge_resistance", si.Ohm, either(orZero(t.DischargeResistance), t.DischargeResistance != nil, part.DischargeResistance), func(p *parts) *float64 { return &p.timer.resistance }},
		{"delay", si.Second, either(orZero(t.Delay), t.Delay != nil, part.Delay), func(p *parts) *float64 { return &p.timer.delay }},
		{"edge", si.Second, part.Edge.spread(), func(p *parts) *float64 { return &p.timer.edge }},
		{"control_resistance", si.Ohm, part.ControlResistance.spread(), func(p *parts) *float64 { return &p.timer.controlResistance }},
	} {
		if v.high != 0 {
			m.vary(v.name, v.unit, v.spread, v.at)
		}
	}
	return m.resolveOutput(part)
}

// orZero dereferences an override, so that an absent one can be asked about too.
func orZero[T any](p *T) T {
	if p == nil {
		var zero T
		return zero
	}
	return *p
}

// triggerRatio is trigger over threshold: both come from one divider, so a
// trigger given beside a threshold moves with it, and its tolerance is the ratio's.
func triggerRatio(t *sweeps.Timer, part TimerPart, threshold float64) spread {
	if t.Trigger == nil {
		return part.TriggerRatio.spread()
	}
	own := part.TriggerRatio.spread()
	return own.moved(t.Trigger.SI() / threshold)
}

// resolveOutput fits the output tables, the board's own rows before the part's.
// Rows of the board file are what that output does: they have no spread of their own.
func (m *Model) resolveOutput(part TimerPart) error {
	var err error
	if m.drop, err = fitLevels(part.Drop, m.board.Timer.Drop); err != nil {
		return fmt.Errorf("drop: %w", err)
	}
	if m.low, err = fitLevels(part.Low, m.board.Timer.Low); err != nil {
		return fmt.Errorf("low: %w", err)
	}
	scale := func(name string, own bool, f Figure, any bool, at func(*parts) *float64) {
		*at(&m.nominal) = 1
		if any && !own && f.Typical != 0 {
			m.vary(name, si.One, f.spread(), at)
		}
	}
	scale("drop_scale", len(m.board.Timer.Drop) > 0, part.DropScale, len(m.drop) > 0, func(p *parts) *float64 { return &p.timer.dropScale })
	scale("low_scale", len(m.board.Timer.Low) > 0, part.LowScale, len(m.low) > 0, func(p *parts) *float64 { return &p.timer.lowScale })
	m.quiescent = part.Quiescent
	if q := m.board.Timer.Quiescent; q != nil {
		nominal, tol, isNormal := q.Spread()
		m.quiescent = [][3]float64{{0, nominal, nominal}}
		m.vary("quiescent_scale", si.One, tolerance(1, tol, isNormal), func(p *parts) *float64 { return &p.timer.quiescentRate })
		return nil
	}
	scale("quiescent_scale", false, part.QuiescentScale, len(part.Quiescent) > 0, func(p *parts) *float64 { return &p.timer.quiescentRate })
	return nil
}

// resolveSwitch takes the driver's transistor from the catalogue or inline.
func (m *Model) resolveSwitch(c *Catalogue) error {
	d := &m.board.Driver
	if d.Stage == sweeps.StageNone {
		return nil
	}
	part, err := transistorPart(c, d)
	if err != nil {
		return err
	}
	if part.Kind != string(d.Stage) {
		return fmt.Errorf("%s is of kind %s, but the stage is %s", part.Name, part.Kind, d.Stage)
	}
	m.rated.transistor = part
	m.rds = part.Rds
	q := &m.nominal.switchPart
	q.hfeMin, q.storage, q.breakdown = part.HFEMin, part.StorageTime, part.Breakdown
	for _, v := range []struct {
		name string
		unit si.Unit
		f    Figure
		at   func(*parts) *float64
	}{
		{"vbe", si.Volt, part.VBE, func(p *parts) *float64 { return &p.switchPart.vbe }},
		{"transistor.base_resistance", si.Ohm, part.BaseResistance, func(p *parts) *float64 { return &p.switchPart.baseR }},
		{"vce_sat", si.Volt, part.VCESat, func(p *parts) *float64 { return &p.switchPart.vceSat }},
		{"saturation_resistance", si.Ohm, part.SaturationResistance, func(p *parts) *float64 { return &p.switchPart.satR }},
		{"beta_f", si.One, part.BetaF, func(p *parts) *float64 { return &p.switchPart.betaF }},
		{"beta_r", si.One, part.BetaR, func(p *parts) *float64 { return &p.switchPart.betaR }},
		{"vgs_th", si.Volt, part.VgsTh, func(p *parts) *float64 { return &p.switchPart.vgsTh }},
		{"rds_scale", si.One, part.RdsScale, func(p *parts) *float64 { return &p.switchPart.rdsScale }},
	} {
		if v.f.spread().high != 0 {
			m.vary(v.name, v.unit, v.f.spread(), v.at)
		}
	}
	base := func(p *parts) *float64 { return &p.switchPart.base }
	switch {
	case d.Stage == sweeps.StageNMOS && d.GateResistor != nil:
		m.vary("gate_resistor", si.Ohm, spreadOf(*d.GateResistor), base)
	case d.Stage != sweeps.StageNMOS && d.BaseResistor != nil:
		m.vary("base_resistor", si.Ohm, spreadOf(*d.BaseResistor), base)
	}
	return nil
}

// transistorPart is the catalogue's, or an inline one. An inline MOSFET's rds_on is
// taken to hold from 4.5 V of gate voltage up, and below to grow as the channel law says.
func transistorPart(c *Catalogue, d *sweeps.Driver) (TransistorPart, error) {
	if d.Part.Name != "" {
		return find("transistor", d.Part.Name, c.Transistors, func(p TransistorPart) string { return p.Name })
	}
	p := TransistorPart{
		Name: "inline", Kind: string(d.Stage), HFEMin: d.Part.HFEMin,
		VBE: Figure{Typical: d.Part.VBE}, VCESat: Figure{Typical: d.Part.VCESat},
		VgsTh: Figure{Typical: d.Part.VgsTh}, RdsScale: Figure{Typical: 1}, Breakdown: inlineBreakdown,
	}
	if d.Stage == sweeps.StageNMOS {
		p.Rds = [][2]float64{{max(inlineGate, d.Part.VgsTh+1), d.Part.RdsOn}}
	}
	return p, p.check()
}

// inlineBreakdown is taken for an inline transistor, V: the lowest of the catalogue's kind.
const inlineBreakdown = 30

// inlineGate is the gate voltage, V, at which logic-level parts are specified.
const inlineGate = 4.5
