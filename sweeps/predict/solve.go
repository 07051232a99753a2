package predict

import (
	"math"

	"nightbench/sweeps"
)

// stop says why a board does not oscillate.
type stop uint8

const (
	oscillates stop = iota
	stuckCharging
	stuckDischarging
)

// rhythm is what the timing network does.
type rhythm struct {
	high, low      float64 // s
	crest, trough  float64 // V at the capacitor
	threshold      float64 // V
	trigger        float64
	into, outOf    float64 // A, mean capacitor current in each phase
	chargeCurrent  float64 // A at the end of charge, discharge: what is left where it stops
	dischargeAtEnd float64
	stop           stop
}

// time runs both phases. The comparator's delay lengthens its phase and carries the wave past its level.
func (m *Model) time(p *parts, c *conditions, charge, discharge *law) (r rhythm) {
	r.threshold, r.trigger = m.thresholds(p, c)
	top, bottom := charge.end(r.threshold), discharge.end(r.trigger)
	r.chargeCurrent, r.dischargeAtEnd = top.i, bottom.i
	switch {
	case !charge.runs(top):
		r.stop = stuckCharging
		return r
	case !discharge.runs(bottom):
		r.stop = stuckDischarging
		return r
	}
	td := p.timer.delay
	r.crest, r.trough = charge.coast(top, r.threshold, td), discharge.coast(bottom, r.trigger, td)
	r.high = td + charge.time(&m.rule, charge.end(r.trough), top)
	r.low = td + discharge.time(&m.rule, discharge.end(r.crest), bottom)
	swing := p.capacitor * (r.crest - r.trough)
	r.into, r.outOf = swing/r.high, swing/r.low
	return r
}

// thresholds are the comparators' levels, V: one divider makes both, and what is fed to pin 5 moves both.
func (m *Model) thresholds(p *parts, c *conditions) (threshold, trigger float64) {
	threshold = p.timer.threshold * c.supply
	if ctl := m.board.Timing.Control; ctl != nil {
		own, fed := p.timer.controlResistance, ctl.Resistance.SI()
		if own+fed > 0 {
			threshold = (threshold*fed + ctl.Voltage.SI()*own) / (own + fed)
		}
	}
	return threshold, threshold * p.timer.triggerRatio
}

// outcome is everything known of one board at one setpoint.
type outcome struct {
	rhythm
	driver
	wave   wave
	emf    float64
	output output
	supply, temperature,
	pot, highLevel, lowLevel,
	supplyCurrent, outputCurrent, average float64
	mechanical float64 // s, J·R/K²
	stalled    bool
	starved    bool // too little base current: the transistor does not saturate
	isOn       bool
	k          float64 // V s/rad; 0: the load is no motor
	usesPot    bool
	held       Output
	edge       float64
}

// solve computes one board at one setpoint. It allocates nothing.
func (m *Model) solve(nominal *parts, c conditions) (o outcome) {
	p := *nominal
	m.warm(&p, c.kelvin)
	o.output = output{c.supply, m.drop, m.low, p.timer.dropScale, p.timer.lowScale, p.timer.dropShift, m.rated.timer.PushPull, 0}
	if m.board.Load.ToSupply && p.load.k == 0 && p.load.l == 0 {
		o.output.pull = p.load.r + c.burden
	}
	o.supply, o.temperature, o.pot, o.edge = c.supply, c.kelvin-273.15, c.pot, p.timer.edge
	o.k, o.usesPot = p.load.k, m.board.Timing.UsesPot()
	switch {
	case c.held != Oscillating:
		m.solveHeld(&o, &p, &c)
		return o
	case m.board.Timing.Network == sweeps.OutputFed:
		m.solveFed(&o, &p, &c)
		return o
	}
	charge, discharge := m.laws(&p, &c, &o.output, 0, 0)
	o.rhythm = m.time(&p, &c, &charge, &discharge)
	if o.stop == oscillates {
		m.drive(&o, &p, &c, 0, 0)
		m.account(&o, &p, &c)
	}
	return o
}

// solveHeld is a board whose output stays where it is: a period of one second, all of it high or low.
func (m *Model) solveHeld(o *outcome, p *parts, c *conditions) {
	o.held = c.held
	o.threshold, o.trigger = m.thresholds(p, c)
	o.high, o.low = 1, 0
	if c.held == HeldLow {
		o.high, o.low = 0, 1
	}
	m.drive(o, p, c, 0, 0)
	m.account(o, p, c)
}

// solveFed solves timing and load together, each loading the output for the other: at most 20 rounds.
func (m *Model) solveFed(o *outcome, p *parts, c *conditions) {
	var high, low float64
	for range 20 {
		charge, discharge := m.laws(p, c, &o.output, high, low)
		if o.rhythm = m.time(p, c, &charge, &discharge); o.stop != oscillates {
			return
		}
		m.drive(o, p, c, o.into, o.outOf)
		h, l := m.carried(o)
		settled := math.Abs(h-high) <= 1e-9+1e-7*high && math.Abs(l-low) <= 1e-9+1e-7*low
		if high, low = h, l; settled {
			break
		}
	}
	m.account(o, p, c)
}

// carried is what the load draws from the output in each phase, A.
func (m *Model) carried(o *outcome) (high, low float64) {
	switch {
	case m.board.Driver.Stage != sweeps.StageNone:
		return o.base, 0
	case m.board.Load.ToSupply:
		return 0, o.wave.spells[driven].mean()
	}
	return o.wave.spells[driven].mean(), 0
}

func (s *spell) mean() float64 {
	if s.t == 0 {
		return 0
	}
	return s.q / s.t
}

// drive solves stage and load together, extra amperes of the timing network loading the output besides.
func (m *Model) drive(o *outcome, p *parts, c *conditions, high, low float64) {
	o.driver = m.control(p, &o.output, high)
	o.isOn = m.on(p, &o.driver)
	e := engaged{m: m, o: o, p: p, c: c, extra: high, idle: low, y: m.cycle(o, p, c)}
	if m.board.Load.ToSupply {
		e.extra, e.idle = low, high
	}
	e.on = 0.5 * c.supply / (p.load.r + c.burden)
	if p.load.k > 0 {
		e.on = math.Min(e.on, 2*p.load.coulomb/p.load.k)
	}
	e.fly = e.on
	if !e.chase() {
		e.settle()
	}
	o.stalled = p.load.k > 0 && o.emf == 0
	o.starved = o.base > 0 && o.wave.peak > p.switchPart.gain()*o.base
	o.mechanical = p.load.tau(o.sources[driven].r + c.burden)
}

// cycle is the period as the load sees it: driven while high, or for a load to the supply while low.
func (m *Model) cycle(o *outcome, p *parts, c *conditions) cycle {
	y := cycle{on: o.high, off: o.low, r: p.load.r, l: p.load.l, burden: c.burden, brush: p.load.brush}
	switch {
	case m.board.Driver.Stage != sweeps.StageNone:
		store := math.Min(p.switchPart.storage, y.off)
		y.on, y.off = y.on+store, y.off-store
	default:
		y.reverses = true
		if m.board.Load.ToSupply {
			y.on, y.off = y.off, y.on
		}
	}
	return y
}

// account adds up the levels and the currents of the supply.
func (m *Model) account(o *outcome, p *parts, c *conditions) {
	period := o.high + o.low
	charging := 0.0
	if m.board.Timing.Network == sweeps.OutputFed {
		charging = o.into
	}
	load := (o.wave.spells[driven].q + o.wave.spells[clamped].q) / period // clamped: back into the supply
	high, low := m.carried(o)
	o.highLevel, _ = o.output.level(true, high+charging)
	o.lowLevel, _ = o.output.sink(low)
	if m.board.Driver.Stage == sweeps.StageNone {
		o.outputCurrent = load
		m.offLevel(o)
	} else {
		o.outputCurrent = o.base * o.high / period
		o.supplyCurrent = o.outputCurrent
	}
	o.outputCurrent += charging * o.high / period
	o.supplyCurrent += load + m.idle(o, p, c)
	o.average = m.mean(o, c, m.o.Average[0]) - m.mean(o, c, m.o.Average[1])
}

// offLevel is the output's level in the phase that does not drive a winding: beyond
// the rail while current freewheels, at the other side's drop while it brakes, off
// the supply by the back-EMF at rest; whichever lasts longest.
func (m *Model) offLevel(o *outcome) {
	longest := &o.wave.spells[free]
	for _, s := range []state{braked, resting} {
		if o.wave.spells[s].t > longest.t {
			longest = &o.wave.spells[s]
		}
	}
	if longest.t == 0 || o.k == 0 {
		return
	}
	v := longest.volts / longest.t
	if m.board.Load.ToSupply {
		o.highLevel = o.supply - v
		return
	}
	o.lowLevel = v
}

// idle is what timer and timing network draw from the supply on average, A.
func (m *Model) idle(o *outcome, p *parts, c *conditions) float64 {
	period := o.high + o.low
	low, high := m.quiescentAt(c.supply)
	i := p.timer.quiescentRate * (low*o.low + high*o.high) / period
	i += o.into * o.high / period
	if m.board.Timing.Network == sweeps.OutputFed {
		return i
	}
	rs := m.resistances(p, c)
	sunk := (c.supply - p.timer.offset - p.timer.resistance*o.outOf) / (rs.charge + p.timer.resistance)
	return i + sunk*o.low/period
}

// quiescentAt interpolates the timer's own current, output low and high, between supplies; beyond them the nearest figure holds.
func (m *Model) quiescentAt(supply float64) (low, high float64) {
	q := m.quiescent
	switch n := len(q); {
	case n == 0:
		return 0, 0
	case n == 1 || supply <= q[0][0]:
		return q[0][1], q[0][2]
	case supply >= q[n-1][0]:
		return q[n-1][1], q[n-1][2]
	}
	k := 1
	for q[k][0] < supply {
		k++
	}
	f := (supply - q[k-1][0]) / (q[k][0] - q[k-1][0])
	return q[k-1][1] + f*(q[k][1]-q[k-1][1]), q[k-1][2] + f*(q[k][2]-q[k-1][2])
}
