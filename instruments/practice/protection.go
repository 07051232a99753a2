package practice

import (
	"math"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// fuse is the over-current protection: the mean current of fuseWindow above the level trips it.
type fuse struct {
	on    bool
	level float64 // A
	timer *tick
	mean  *circuit.Mean // of the window that runs; nil: none
}

// fuseWindow is the time over which over-current has to last, s (common practice, no source).
const fuseWindow = 50e-3

// watch begins or ends looking at the current.
func (f *fuse) watch(live bool, sim *circuit.Sim) {
	if !f.on || !live {
		f.mean, f.timer.at = nil, math.Inf(1)
		return
	}
	if f.mean == nil {
		f.mean = circuit.NewMean(circuit.Through(circuit.SupplyCurrent), sim.Now(), sim.Now()+fuseWindow)
		must(sim.Watch(f.mean))
		f.timer.at = f.mean.T1
	}
}

// weigh ends a window: it trips, or the next one begins.
func (s *supply) weigh(sim *circuit.Sim) {
	over := s.fuse.mean != nil && s.fuse.mean.Value() > s.fuse.level
	s.fuse.mean = nil
	if over {
		s.trip(overCurrent)
		s.apply(sim)
		return
	}
	s.fuse.watch(s.live(), sim)
}

// watchdog switches the output off when no message comes for a while.
type watchdog struct {
	on    bool
	delay float64 // s, wall
	timer *tick
}

// fed starts the wait anew.
func (d *watchdog) fed(now float64, w *world) {
	if d.timer.at = math.Inf(1); d.on {
		d.timer.at = now + w.wall(d.delay)
	}
}

// trip sets a latch. A supply that stays off forgets that its output was on.
func (s *supply) trip(l latch) {
	s.latch |= l
	if s.kind.StaysOff {
		s.on = false
	}
}

// protect is looked at whenever the board has been advanced: over-voltage latches the output off.
func (s *supply) protect() {
	sim := s.world.sim
	if s.live() && sim.State().Supply > s.protection {
		s.trip(overVoltage)
		s.apply(sim)
	}
}

// clear lets go of latches, which may switch the output on again.
func (s *supply) clear(l latch) error {
	s.change(func() { s.latch &^= l })
	return nil
}

func (s *supply) tripped(l latch) (string, error) {
	return scpi.Bit(ask(s, func() bool { return s.latch&l != 0 })), nil
}

func (s *supply) registerProtection() {
	s.Value("[SOURce:]VOLTage:PROTection[:LEVel]", scpi.Numeric{Unit: "V", Max: supplyMostVolts + 1},
		func(*scpi.Call) float64 { return ask(s, func() float64 { return s.protection }) },
		func(_ *scpi.Call, v float64) error {
			s.change(func() { s.protection = quantise(v, protectionStep) })
			return nil
		})
	s.Value("[SOURce:]CURRent:PROTection[:LEVel]", scpi.Numeric{Unit: "A", Max: supplyMostAmperes * 1.1},
		func(*scpi.Call) float64 { return ask(s, func() float64 { return s.fuse.level }) },
		func(_ *scpi.Call, a float64) error { s.change(func() { s.fuse.level = a }); return nil })
	s.flag("[SOURce:]CURRent:PROTection:STATe", &s.fuse.on)
	for header, l := range map[string]latch{"[SOURce:]VOLTage:PROTection": overVoltage, "[SOURce:]CURRent:PROTection": overCurrent, "OUTPut:PROTection:WDOG": noMessage} {
		s.Get(header+":TRIPped", func(*scpi.Call) (string, error) { return s.tripped(l) })
		s.Set(header+":CLEar", func(*scpi.Call) error { return s.clear(l) })
	}
	s.Set("OUTPut:PROTection:CLEar", func(*scpi.Call) error { return s.clear(overVoltage | overCurrent | noMessage) })
	// The communication watchdog as Keysight's N6700 family spells it, from memory; :TRIPped? and :CLEar are ours.
	s.flag("OUTPut:PROTection:WDOG[:STATe]", &s.dog.on)
	s.Value("OUTPut:PROTection:WDOG:DELay", scpi.Numeric{Unit: "S", Min: 1, Max: 3600, Default: 60},
		func(*scpi.Call) float64 { return ask(s, func() float64 { return s.dog.delay }) },
		func(_ *scpi.Call, v float64) error { s.change(func() { s.dog.delay = v }); return nil })
}

// flag registers both forms of a switch.
func (s *supply) flag(pattern string, v *bool) {
	s.Set(pattern, func(c *scpi.Call) error { on := c.Bool(0); s.change(func() { *v = on }); return nil }, scpi.Boolean{})
	s.Get(pattern, func(*scpi.Call) (string, error) { return scpi.Bit(ask(s, func() bool { return *v })), nil })
}

// power is the mains going, or coming back.
func (s *supply) power(on bool) {
	s.change(func() {
		s.mains = on
		if on && !s.kind.Resumes {
			s.defaults()
		}
	})
}
