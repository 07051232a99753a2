package practice

import (
	"context"
	"math/rand/v2"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// Ratings and resolutions of the practice supply, those of a small bench supply.
const (
	supplyMostVolts   = 32.0
	supplyMostAmperes = 3.0
	supplyVoltStep    = 1e-3
	supplyAmpereStep  = 1e-4
	supplyLimitStep   = 1e-3
	protectionStep    = 10e-3
	supplyAperture    = 20e-3 // s, of its own readback
	supplyAnswer      = 2e-3  // s, to understand a message and begin the reply
)

// Supply says in what practice supplies differ. The zero Supply keeps to the dialect.
type Supply struct {
	StaysOff bool    // after a latch is cleared; otherwise the output is restored as it was before the trip
	Resumes  bool    // after the mains was gone: settings and output as before; otherwise as at *RST
	Watchdog float64 // s (wall) without a message after which the output goes off; 0: off until switched on
}

// supply is one channel that keeps to the contract of the standard-supply dialect.
type supply struct {
	*scpi.Device
	world *world
	rng   *rand.Rand
	log   *supplyLog
	kind  Supply

	set, readV, readI faulty

	// Guarded by the world's lock: the board's side acts on them too.
	volts, amperes, protection float64
	on                         bool
	latch                      latch // holds the output off
	fuse                       fuse
	dog                        watchdog
	mains, relay               bool // the mains is there; the cutoff's contact is closed
}

// latch says which protection holds the output off; zero: none.
type latch uint8

const (
	overVoltage latch = 1 << iota
	overCurrent
	noMessage // the communication watchdog
)

func newSupply(w *world, r *rand.Rand, kind Supply, log *supplyLog) *supply {
	s := &supply{
		Device: scpi.NewDevice("Nightbench,practice-supply,PS-1,1.0", 20), world: w, rng: r, log: log, kind: kind,
		set:   draw(r, 0.0005/2, 5e-3), // programming
		readV: draw(r, 0.0005, 3e-3),   // readback: 0.05 % + 5 mV are stated
		readI: draw(r, 0.0015, 3e-3),   // readback: 0.15 % + 5 mA are stated
		mains: true, relay: true,
	}
	s.Reset = func() { s.change(s.defaults) }
	s.dog.timer = w.timer(func(sim *circuit.Sim) { s.latch |= noMessage; s.apply(sim) })
	s.fuse.timer = w.timer(s.weigh)
	w.after = s.protect
	s.defaults()
	s.amperes = 0.1
	s.register()
	s.registerProtection()
	return s
}

// change alters the supply's state, at the board's present, and lets the board feel it.
func (s *supply) change(f func()) {
	s.world.do(func(sim *circuit.Sim) { f(); s.apply(sim) })
	s.world.do(func(*circuit.Sim) {}) // protections look at once
}

// ask reads something of the supply's state, at the board's present.
func ask[T any](s *supply, f func() T) (v T) {
	s.world.do(func(*circuit.Sim) { v = f() })
	return v
}

func (s *supply) register() {
	s.Value("[SOURce:]VOLTage[:LEVel][:IMMediate][:AMPLitude]", scpi.Numeric{Unit: "V", Max: supplyMostVolts},
		func(*scpi.Call) float64 { return ask(s, func() float64 { return s.volts }) }, s.setVolts)
	s.Value("[SOURce:]CURRent[:LEVel][:IMMediate][:AMPLitude]", scpi.Numeric{Unit: "A", Max: supplyMostAmperes},
		func(*scpi.Call) float64 { return ask(s, func() float64 { return s.amperes }) },
		func(_ *scpi.Call, a float64) error {
			s.change(func() { s.amperes = quantise(a, supplyLimitStep) })
			return nil
		})
	s.Set("OUTPut[:STATe]", func(c *scpi.Call) error { return s.switchTo(c.Bool(0)) }, scpi.Boolean{})
	s.Get("OUTPut[:STATe]", func(*scpi.Call) (string, error) { return scpi.Bit(ask(s, s.live)), nil })
	s.Get("MEASure[:SCALar]:VOLTage[:DC]", func(c *scpi.Call) (string, error) {
		return s.measure(c.Context, circuit.Between(circuit.Supply, circuit.Common), s.readV, supplyVoltStep)
	})
	s.Get("MEASure[:SCALar]:CURRent[:DC]", func(c *scpi.Call) (string, error) {
		return s.measure(c.Context, circuit.Through(circuit.SupplyCurrent), s.readI, supplyAmpereStep)
	})
}

func (s *supply) instrument() *Instrument {
	return &Instrument{
		device: s.Device, answer: s.answer, mains: s.power,
		own: map[Kind]func() func(){Tripped: func() func() { s.change(func() { s.trip(overVoltage) }); return nil }},
	}
}

func (s *supply) answer(ctx context.Context, message []byte) []byte {
	if s.world.clock.Sleep(ctx, seconds(supplyAnswer)) != nil {
		return nil
	}
	s.log.heard(string(message))
	s.look()
	return s.Execute(ctx, message)
}

// look brings the condition register up to date: bit 0 in constant current, bit 1 in constant voltage.
func (s *supply) look() {
	var bits uint16
	s.world.do(func(sim *circuit.Sim) {
		s.dog.fed(sim.Now(), s.world)
		switch {
		case s.live() && sim.Limiting():
			bits = 1
		case s.live():
			bits = 2
		}
	})
	s.Status.Questionable.SetCondition(bits)
}

// live tells whether the output is on now.
func (s *supply) live() bool { return s.on && s.latch == 0 && s.mains }

func (s *supply) setVolts(_ *scpi.Call, v float64) error {
	v = quantise(v, supplyVoltStep)
	if ask(s, func() bool { return v > s.protection }) {
		return scpi.NewFault(scpi.SettingsConflict, "above VOLT:PROT")
	}
	s.change(func() { s.volts = v })
	return nil
}

func (s *supply) switchTo(on bool) error {
	if on && ask(s, func() bool { return s.latch != 0 }) {
		return scpi.NewFault(scpi.SettingsConflict, "protection tripped")
	}
	s.change(func() { s.on = on })
	return nil
}

// defaults is the state at *RST.
func (s *supply) defaults() {
	s.on, s.latch, s.volts, s.amperes, s.protection = false, 0, 0, 0.001, supplyMostVolts+1
	s.fuse.on, s.fuse.level = false, supplyMostAmperes*1.1
	s.dog.on, s.dog.delay = s.kind.Watchdog > 0, 60
	if s.dog.on {
		s.dog.delay = s.kind.Watchdog
	}
}

// apply brings the settings to the board and logs a change of the output. The world's lock is held.
func (s *supply) apply(sim *circuit.Sim) {
	v := s.set.of(s.volts)
	if s.volts == 0 || v < 0 {
		v = 0
	}
	must(sim.SetSupply(v))
	must(sim.SetLimit(s.amperes))
	sim.SetOutput(s.live() && s.relay)
	s.fuse.watch(s.live(), sim)
	s.dog.fed(sim.Now(), s.world)
	s.log.output(s.live(), s.volts)
}

// must is for what can't fail: a setting was held against its limits before.
func must(err error) {
	if err != nil {
		panic(err)
	}
}

// bled is what the supply's own bleeder takes: it sits before the ammeter, which doesn't see it.
func bled(sim *circuit.Sim) float64 {
	ohms := sim.Board().Source.Bleed
	if ohms <= 0 {
		return 0
	}
	return sim.State().Supply / ohms
}

// measure averages a probe over the readback's aperture. Behind an open cutoff the
// supply sees its own terminals, not the board.
func (s *supply) measure(ctx context.Context, p circuit.Probe, f faulty, step float64) (string, error) {
	m, err := s.world.mean(ctx, p, supplyAperture)
	if err != nil {
		return "", err
	}
	x := m.Value()
	s.world.do(func(sim *circuit.Sim) {
		if s.live() && p == circuit.Through(circuit.SupplyCurrent) {
			x -= bled(sim)
		}
		if !s.relay {
			x = 0
			if s.live() && p != circuit.Through(circuit.SupplyCurrent) {
				x = s.set.of(s.volts)
			}
		}
	})
	return scpi.NR3(quantise(f.of(x)+s.rng.NormFloat64()*step/2, step)), nil
}
