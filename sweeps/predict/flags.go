package predict

import (
	"fmt"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// The names of the flags a prediction may carry.
const (
	NoOscillation = "no_oscillation" // a phase never ends
	Stalled       = "stalled"        // the shaft does not turn
	NoStart       = "no_start"       // it turns if already turning, but does not start from rest
	SpeedRipple   = "speed_ripple"   // speed changes within a period: wider band
	NeverOn       = "never_on"       // the transistor is not turned on
	NotFullyOn    = "not_fully_on"   // a gate below what its on-resistance is specified at
	Unsaturated   = "unsaturated"    // not enough base current for the collector's peak
	OutputLimit   = "output_limit"   // more current than the timer's output may carry
	SupplyRange   = "supply_range"   // outside the supply the board or its timer is rated for
	SharedOutput  = "shared_output"  // an output-fed network on the same output as a winding: wider band
	NoFlyback     = "no_flyback"     // an inductive load's current is cut by the transistor's breakdown
)

// rippleLimit is T/τm above which speed may no longer be taken as constant over a period.
const rippleLimit = 0.1

func show(x float64, u si.Unit) string { return si.Format(x, u) }

// flags says in words what deserves distrust at this setting.
func (m *Model) flags(o *outcome, s Setting) []sweeps.Flag {
	fs := []sweeps.Flag{}
	add := func(name, format string, a ...any) {
		fs = append(fs, sweeps.Flag{Name: name, Words: fmt.Sprintf(format, a...)})
	}
	m.flagSupply(s, add)
	switch o.stop {
	case stuckCharging:
		add(NoOscillation, "does not oscillate: the capacitor never rises to the threshold of %s; %s is left to charge it there", show(o.threshold, si.Volt), show(o.chargeCurrent, si.Ampere))
		return fs
	case stuckDischarging:
		add(NoOscillation, "does not oscillate: the capacitor never falls to the trigger level of %s; %s is left to discharge it there", show(o.trigger, si.Volt), show(-o.dischargeAtEnd, si.Ampere))
		return fs
	}
	m.flagDriver(o, add)
	if share := m.shared(); share > 0 {
		add(SharedOutput, "the winding's current moves the output that feeds the timing network: times are good to %.0f %% only, the band is widened; give the load a transistor", 100*share)
	}
	if o.k > 0 && o.isOn {
		m.flagMotor(o, s, add)
	}
	return fs
}

// supplyError is how far a supply set to a board's rating may read beyond it and still be at it: more than any bench supply's own error.
const supplyError = 2e-3

// flagSupply allows a supply 1 % off: setpoints are at the rated ends, and measured values scatter.
func (m *Model) flagSupply(s Setting, add func(string, string, ...any)) {
	lo, hi := m.board.RatedSupply[0].SI(), m.board.RatedSupply[1].SI()
	if hi > 0 && (s.Supply < lo*(1-supplyError) || s.Supply > hi*(1+supplyError)) {
		add(SupplyRange, "%s is outside the board's rated %s to %s", show(s.Supply, si.Volt), show(lo, si.Volt), show(hi, si.Volt))
	}
	if r := m.rated.timer.RecommendedSupply.spread(); r.high > 0 && (s.Supply < r.low*0.99 || s.Supply > r.high*1.01) {
		add(SupplyRange, "%s is outside the %s to %s recommended for the %s timer", show(s.Supply, si.Volt), show(r.low, si.Volt), show(r.high, si.Volt), m.rated.timer.Name)
	}
}

func (m *Model) flagDriver(o *outcome, add func(string, string, ...any)) {
	q := &m.nominal.switchPart
	stage := m.board.Driver.Stage
	on := &o.wave.spells[driven]
	if !o.isOn {
		add(NeverOn, "the %s never turns on: the timer's high level is %s", stage, show(o.highLevel, si.Volt))
		return
	}
	switch stage {
	case sweeps.StageNMOS:
		if o.gate < m.rds[0][0] {
			add(NotFullyOn, "not fully on: %s at the gate, the on-resistance is specified from %s", show(o.gate, si.Volt), show(m.rds[0][0], si.Volt))
		}
	case sweeps.StageNPN, sweeps.StageDarlington:
		m.flagSaturation(o, q, add)
	}
	pin := o.base
	if stage == sweeps.StageNone {
		pin = o.wave.peak
	}
	if limit := m.rated.timer.MaxOutputCurrent.Typical; limit > 0 && pin > limit {
		add(OutputLimit, "the timer's output would carry %s, more than its %s; use a transistor", show(pin, si.Ampere), show(limit, si.Ampere))
	}
	if stage != sweeps.StageNone && m.nominal.load.l > 0 && m.nominal.fb.is == 0 && on.q > 0 {
		add(NoFlyback, "no flyback diode: the load's current is cut by the transistor's breakdown at %s", show(q.breakdown, si.Volt))
	}
}

// flagSaturation compares the collector's peak with what the least gain gives; the
// dissipation is of a transistor that limits at that current and takes the rest of the supply.
func (m *Model) flagSaturation(o *outcome, q *transistor, add func(string, string, ...any)) {
	limit := q.hfeMin * o.base
	if o.wave.peak <= limit {
		return
	}
	level := "a sample of least gain would not saturate"
	if o.starved {
		level = "out of saturation, no level is predicted"
	}
	add(Unsaturated, "%s: the collector would carry %s, hFE %.0f times %s of base current give %s; up to %s lost in the transistor", level,
		show(o.wave.peak, si.Ampere), q.hfeMin, show(o.base, si.Ampere), show(limit, si.Ampere), show(limit*max(0, o.supply-limit*m.nominal.load.r), si.Watt))
}

func (m *Model) flagMotor(o *outcome, s Setting, add func(string, string, ...any)) {
	locked := m.locked(&m.nominal, s.conditions(), o)
	twitches, _ := m.nominal.load.starts(&locked.wave)
	switch {
	case o.stalled:
		add(Stalled, "the motor stands: %s of mean current give less torque than the %s of friction", show(o.wave.current(), si.Ampere), show(m.nominal.load.coulomb, si.NewtonMetre))
	case !twitches:
		add(NoStart, "the motor keeps turning but does not start from rest: %s of peak torque against %s of static friction",
			show(m.nominal.load.k*locked.wave.peak, si.NewtonMetre), show(max(m.nominal.load.static, m.nominal.load.coulomb), si.NewtonMetre))
	}
	if ratio := o.ripple(); ratio >= rippleLimit && !o.stalled {
		add(SpeedRipple, "speed changes within a period: it lasts %.0f %% of the motor's mechanical time constant of %s; the band is widened", 100*ratio, show(o.mechanical, si.Second))
	}
}

// shared is by how much, relative, a winding on the output of an output-fed network
// moves times and means: freewheeling holds the node beyond a rail, which the laws
// of the timing network leave out. Bounds of what circuit simulation of a dozen such boards showed.
func (m *Model) shared() float64 {
	l := &m.nominal.load
	switch {
	case m.board.Timing.Network != sweeps.OutputFed || m.board.Driver.Stage != sweeps.StageNone || l.k == 0 && l.l == 0:
		return 0
	case m.board.Load.ToSupply:
		return 0.2
	}
	return 0.1
}

// ripple is T/τm, 0 where no inertia is given.
func (o *outcome) ripple() float64 {
	if o.mechanical <= 0 || o.held != Oscillating {
		return 0
	}
	return (o.high + o.low) / o.mechanical
}

// locked is the same setpoint with the rotor held: no back-EMF, so the largest current.
func (m *Model) locked(nominal *parts, c conditions, running *outcome) outcome {
	held, o := *nominal, *running
	m.warm(&held, c.kelvin)
	held.load.k = 0
	high, low := 0.0, 0.0
	if m.board.Timing.Network == sweeps.OutputFed {
		high, low = o.into, o.outOf
	}
	m.drive(&o, &held, &c, high, low)
	m.account(&o, &held, &c)
	return o
}
