package predict

import (
	"fmt"
	"math"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// Caution is the share of a rating above which a plan is cautioned; above 1 it is refused.
const Caution = 0.7

// Stress is one part's load at a setting, against its rating. A rating of 0 is not known.
type Stress struct {
	Part   string  `json:"part"`
	What   string  `json:"what"`
	Value  float64 `json:"value"`
	Rating float64 `json:"rating"`
	Unit   si.Unit `json:"unit"`
}

// Share is value over rating; 0 where no rating is known.
func (s Stress) Share() float64 {
	if s.Rating <= 0 {
		return 0
	}
	return s.Value / s.Rating
}

// String says it in words.
func (s Stress) String() string {
	if s.Rating <= 0 {
		return fmt.Sprintf("%s: %s %s, no rating known", s.Part, s.What, show(s.Value, s.Unit))
	}
	return fmt.Sprintf("%s: %s %s, %.0f %% of the %s it is rated for", s.Part, s.What, show(s.Value, s.Unit), 100*s.Share(), show(s.Rating, s.Unit))
}

// StressTable is every part's stress with the motor running and with its rotor
// held. For a load that does not turn the two are the same.
type StressTable struct {
	Running []Stress `json:"running"`
	Locked  []Stress `json:"locked"`
}

// Stress computes the table for the nominal board. The error is of a setting that
// cannot be; a board that does not oscillate has empty tables.
func (m *Model) Stress(s Setting) (StressTable, error) {
	if err := m.checkSetting(s); err != nil {
		return StressTable{}, fmt.Errorf("board %q: %w", m.board.Name, err)
	}
	c := s.conditions()
	o := m.solve(&m.nominal, c)
	if o.stop != oscillates {
		return StressTable{Running: []Stress{}, Locked: []Stress{}}, nil
	}
	held := m.locked(&m.nominal, c, &o)
	return StressTable{Running: m.stress(&o, c), Locked: m.stress(&held, c)}, nil
}

func (m *Model) stress(o *outcome, c conditions) []Stress {
	p := m.nominal
	m.warm(&p, c.kelvin)
	out := m.stressSwitch(o, &p)
	out = append(out, m.stressTimer(o, &p, &c)...)
	out = append(out, m.stressNetwork(o, &p, &c)...)
	sq := 0.0
	for k := range o.wave.spells {
		sq += o.wave.spells[k].sq
	}
	name := string(m.board.Load.Kind)
	out = append(out,
		Stress{name, "mean current", o.wave.current(), m.rated.load.current, si.Ampere},
		Stress{name, "heat in the winding", p.load.r * sq / o.wave.period(), m.rated.load.power, si.Watt})
	return out
}

// lost is the mean power between a source's ideal voltage and the load: what the
// stage's own drop and resistance take, of supply volts offered.
func (s *spell) lost(offered float64, src source, period float64) float64 {
	return ((offered-src.v)*s.q + src.r*s.sq) / period
}

func (m *Model) stressSwitch(o *outcome, p *parts) []Stress {
	var out []Stress
	period, on := o.wave.period(), &o.wave.spells[driven]
	if d := &m.rated.flyback; p.fb.is > 0 {
		f := &o.wave.spells[free]
		out = append(out,
			Stress{"flyback", "mean current", f.q / period, d.MaxCurrent.Typical, si.Ampere},
			Stress{"flyback", "power", f.lost(0, o.sources[free], period), d.MaxPower.Typical, si.Watt},
			Stress{"flyback", "reverse voltage", o.supply, d.MaxReverse.Typical, si.Volt})
	}
	if m.board.Driver.Stage == sweeps.StageNone {
		return out
	}
	t := &m.rated.transistor
	power := on.lost(o.supply, o.sources[driven], period) + o.base*p.switchPart.vbe*o.high/period
	peak := o.wave.peak
	if limit := p.switchPart.hfeMin * o.base; m.board.Driver.Stage != sweeps.StageNMOS && peak > limit { // out of saturation: it limits, and takes the rest of the supply
		peak = limit
		power = math.Max(power, limit*math.Max(0, o.supply-limit*p.load.r)*on.t/period)
	}
	off := o.supply - o.sources[free].v
	if p.fb.is == 0 && p.load.l > 0 {
		power += off * o.wave.spells[free].q / period
		off = math.Max(off, t.Breakdown)
	}
	return append(out,
		Stress{"transistor", "peak current", peak, t.MaxCurrent.Typical, si.Ampere},
		Stress{"transistor", "power", power, t.MaxPower.Typical, si.Watt},
		Stress{"transistor", "voltage when off", off, t.Breakdown, si.Volt})
}

// stressTimer is the chip: its output's current, its discharge pin's, and all it loses.
func (m *Model) stressTimer(o *outcome, p *parts, c *conditions) []Stress {
	t := &m.rated.timer
	period := o.high + o.low
	pin, onPin := o.base, o.base*(o.supply-o.highLevel)*o.high/period
	if m.board.Driver.Stage == sweeps.StageNone {
		pin = o.wave.peak
		onPin = o.wave.spells[driven].lost(o.supply, o.sources[driven], period)
	}
	low, high := m.quiescentAt(c.supply)
	power := p.timer.quiescentRate*(low*o.low+high*o.high)/period*c.supply + onPin
	out := []Stress{{"timer", "output current", pin, t.MaxOutputCurrent.Typical, si.Ampere}}
	if m.board.Timing.Network != sweeps.OutputFed {
		peak, mean := m.discharged(o, p, c)
		power += mean * (p.timer.offset + p.timer.resistance*mean) * o.low / period
		out = append(out, Stress{"timer", "discharge pin, peak current", peak, t.MaxDischargeCurrent.Typical, si.Ampere})
	}
	return append(out,
		Stress{"timer", "power", power, t.MaxPower.Typical, si.Watt},
		Stress{"timer", "supply voltage", c.supply, t.MaxSupply.Typical, si.Volt})
}

// discharged is the discharge pin's current, peak (as the discharge begins) and
// mean over the low phase: the capacitor's and R_A's.
func (m *Model) discharged(o *outcome, p *parts, c *conditions) (peak, mean float64) {
	_, discharge := m.laws(p, c, &o.output, 0, 0)
	rs := m.resistances(p, c)
	ra := (c.supply - p.timer.offset) / (rs.charge + p.timer.resistance)
	return -discharge.end(o.crest).i + ra, o.outOf + ra
}

// stressNetwork is the pot's wiper and the diodes of the timing network, at their peaks.
func (m *Model) stressNetwork(o *outcome, p *parts, c *conditions) []Stress {
	high, low := m.carried(o)
	charge, discharge := m.laws(p, c, &o.output, high, low)
	up, down := charge.end(o.trough).i, -discharge.end(o.crest).i
	var out []Stress
	if p.chargeDiode.is > 0 {
		out = append(out, Stress{"charge_diode", "peak current", up, m.rated.charge.MaxCurrent.Typical, si.Ampere})
	}
	if p.dischargeDiode.is > 0 {
		out = append(out, Stress{"discharge_diode", "peak current", down, m.rated.discharge.MaxCurrent.Typical, si.Ampere})
	}
	if !m.board.Timing.UsesPot() {
		return out
	}
	current, volts := m.potStress(o, p, c, up, down)
	return append(out,
		Stress{"pot", "wiper current", current, m.o.PotMaxCurrent, si.Ampere},
		Stress{"pot", "terminal voltage", volts, m.o.PotMaxVoltage, si.Volt})
}

// potStress is the largest current through the pot's wiper and the highest voltage
// at one of its terminals, by where the pot stands.
func (m *Model) potStress(o *outcome, p *parts, c *conditions, up, down float64) (current, volts float64) {
	t := &m.board.Timing
	rs := m.resistances(p, c)
	switch {
	case t.Network == sweeps.OutputFed:
		volts = o.highLevel
		switch {
		case t.Charge.Pot:
			return up, volts
		case t.Discharge.Pot:
			return down, volts
		}
		return math.Max(up, down), volts
	case t.Charge.Pot: // between S and Q
		return math.Max(up, (c.supply-p.timer.offset)/(rs.charge+p.timer.resistance)), c.supply
	case t.Network == sweeps.Wiper:
		return math.Max(up, down), c.supply
	case t.Network == sweeps.Plain:
		return math.Max(up, down), c.supply
	}
	return down, o.crest + p.chargeDiode.nvt*math.Log1p(math.Max(up, 0)/p.chargeDiode.is)
}
