package practice

import (
	"context"
	"encoding/json"
	"io"
	"math/rand/v2"
	"sync"
	"time"

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

// supply is one channel that keeps to the contract of the standard-supply dialect.
type supply struct {
	*scpi.Device
	world *world
	rng   *rand.Rand
	log   *supplyLog

	volts, amperes, protection float64
	on, tripped                bool
	set, readV, readI          faulty
}

func newSupply(w *world, r *rand.Rand, log io.Writer) *supply {
	s := &supply{
		Device: scpi.NewDevice("Nightbench,practice-supply,PS-1,1.0", 20), world: w, rng: r, log: &supplyLog{w: log, world: w},
		amperes: 0.1, protection: supplyMostVolts + 1,
		set:   draw(r, 0.0005/2, 5e-3), // programming
		readV: draw(r, 0.0005, 3e-3),   // readback: 0.05 % + 5 mV are stated
		readI: draw(r, 0.0015, 3e-3),   // readback: 0.15 % + 5 mA are stated
	}
	s.Reset = s.reset
	w.after = s.protect
	s.register()
	return s
}

func (s *supply) register() {
	s.Value("[SOURce:]VOLTage[:LEVel][:IMMediate][:AMPLitude]", scpi.Numeric{Unit: "V", Max: supplyMostVolts},
		func(*scpi.Call) float64 { return s.volts }, s.setVolts)
	s.Value("[SOURce:]CURRent[:LEVel][:IMMediate][:AMPLitude]", scpi.Numeric{Unit: "A", Max: supplyMostAmperes},
		func(*scpi.Call) float64 { return s.amperes }, s.setAmperes)
	s.Value("[SOURce:]VOLTage:PROTection[:LEVel]", scpi.Numeric{Unit: "V", Max: supplyMostVolts + 1},
		func(*scpi.Call) float64 { return s.protection }, s.setProtection)
	s.Get("[SOURce:]VOLTage:PROTection:TRIPped", func(*scpi.Call) (string, error) { return scpi.Bit(s.tripped), nil })
	s.Set("[SOURce:]VOLTage:PROTection:CLEar", func(*scpi.Call) error { s.tripped = false; s.apply(); return nil })
	s.Set("OUTPut[:STATe]", func(c *scpi.Call) error { return s.switchTo(c.Bool(0)) }, scpi.Boolean{})
	s.Get("OUTPut[:STATe]", func(*scpi.Call) (string, error) { return scpi.Bit(s.live()), nil })
	s.Get("MEASure[:SCALar]:VOLTage[:DC]", func(c *scpi.Call) (string, error) {
		return s.measure(c.Context, circuit.Between(circuit.Supply, circuit.Common), s.readV, supplyVoltStep)
	})
	s.Get("MEASure[:SCALar]:CURRent[:DC]", func(c *scpi.Call) (string, error) {
		return s.measure(c.Context, circuit.Through(circuit.SupplyCurrent), s.readI, supplyAmpereStep)
	})
}

func (s *supply) instrument() *Instrument { return &Instrument{answer: s.answer} }

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
	s.world.do(func(sim *circuit.Sim) {
		var bits uint16
		switch {
		case s.live() && sim.Limiting():
			bits = 1
		case s.live():
			bits = 2
		}
		s.Status.Questionable.SetCondition(bits)
	})
}

// live tells whether the output is on now.
func (s *supply) live() bool { return s.on && !s.tripped }

func (s *supply) setVolts(_ *scpi.Call, v float64) error {
	v = quantise(v, supplyVoltStep)
	if v > s.protection {
		return scpi.NewFault(scpi.SettingsConflict, "above VOLT:PROT")
	}
	s.volts = v
	s.apply()
	return nil
}

func (s *supply) setAmperes(_ *scpi.Call, a float64) error {
	s.amperes = quantise(a, supplyLimitStep)
	s.apply()
	return nil
}

func (s *supply) setProtection(_ *scpi.Call, v float64) error {
	s.protection = quantise(v, protectionStep)
	s.apply()
	return nil
}

func (s *supply) switchTo(on bool) error {
	if on && s.tripped {
		return scpi.NewFault(scpi.SettingsConflict, "protection tripped")
	}
	s.on = on
	s.apply()
	return nil
}

func (s *supply) reset() {
	s.on, s.tripped, s.volts, s.amperes, s.protection = false, false, 0, 0.001, supplyMostVolts+1
	s.apply()
}

// apply brings the settings to the board and logs a change of the output.
func (s *supply) apply() {
	s.world.do(func(sim *circuit.Sim) {
		v := s.set.of(s.volts)
		if s.volts == 0 || v < 0 {
			v = 0
		}
		if err := sim.SetSupply(v); err != nil {
			s.Push(err)
		}
		if err := sim.SetLimit(s.amperes); err != nil {
			s.Push(err)
		}
		sim.SetOutput(s.live())
	})
	s.log.output(s.live(), s.volts)
}

// protect is looked at whenever the board has been advanced: over-voltage latches the output off.
func (s *supply) protect() {
	sim := s.world.sim
	if s.live() && sim.State().Supply > s.protection {
		s.tripped = true
		sim.SetOutput(false)
	}
}

// measure averages a probe over the readback's aperture.
func (s *supply) measure(ctx context.Context, p circuit.Probe, f faulty, step float64) (string, error) {
	m, err := s.world.mean(ctx, p, supplyAperture)
	if err != nil {
		return "", err
	}
	return scpi.NR3(quantise(f.of(m.Value())+s.rng.NormFloat64()*step/2, step)), nil
}

// supplyLog is what the supply was told and when its output was on: a JSON object a line.
type supplyLog struct {
	w     io.Writer
	world *world

	mu   sync.Mutex
	last bool
}

// LogLine is one line of the supply's log.
type LogLine struct {
	At     time.Time `json:"at"`    // wall
	Bench  float64   `json:"bench"` // s of bench time
	Heard  string    `json:"heard,omitempty"`
	Output *bool     `json:"output,omitempty"` // changed to
	Volts  float64   `json:"volts,omitempty"`  // as set
}

func (l *supplyLog) heard(message string) { l.write(LogLine{Heard: message}) }

func (l *supplyLog) output(on bool, volts float64) {
	l.mu.Lock()
	changed := on != l.last
	l.last = on
	l.mu.Unlock()
	if changed {
		l.write(LogLine{Output: &on, Volts: volts})
	}
}

func (l *supplyLog) write(line LogLine) {
	if l.w == nil {
		return
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	line.At, line.Bench = l.world.clock.Now(), l.world.now()
	b, err := json.Marshal(line)
	if err == nil {
		_, err = l.w.Write(append(b, '\n'))
	}
	if err != nil {
		l.w = nil // a log that can't be written is not kept; the supply goes on
	}
}
