package circuit

import (
	"errors"
	"fmt"
	"math"
)

// A State is the board at one instant.
type State struct {
	Time      float64 // s since New
	Supply    float64 // supply node, V
	Capacitor float64 // timing capacitor, V
	Discharge float64 // pin 7, V
	Current   float64 // through the load, A
	Speed     float64 // rad/s; the rotor turns one way only
	Angle     float64 // rad
	Winding   float64 // K
}

// A Sim is one board being simulated. It starts with the supply's output off
// and everything at rest. It is not safe for concurrent use: its owner
// serialises. The time only moves in Advance and Run.
type Sim struct {
	b Board // true values in force
	x State

	set, limit float64 // the supply's settings: V, A
	enabled    bool    // the supply's output
	pot        float64 // ohm
	short      float64 // across the supply, S
	locked     bool
	smooth     bool    // cogging and ripple left out
	ambient    float64 // K

	mode
	turn, release event // the timer's next turn; the switch's delayed opening
	outEdge       edge  // of the timer's output
	loadEdge      edge  // of load_lo

	net                  network
	common               float64 // ohms of the common resistor with the pot
	flyback, body, clamp forward
	on, base             float64 // the switch's resistance; the base current
	reference            float64 // supply voltage on and base were found at

	seg                Segment // the step being made, reused
	stride, loadStride stride  // steps to try next
	fineness           float64 // 1; a half halves every limit on the step
	watchers           []watcher
	cycle              cycle
}

// A mode is what stays as it is during a step.
type mode struct {
	powered bool   // the timer is alive
	high    bool   // its output
	driven  bool   // the switch conducts
	way     int8   // of the load current: +1, 0 at rest, −1
	turning bool   // the rotor
	region  region // of the bench supply
}

// An event is something that will happen at a time already known.
type event struct {
	at   float64 // s; +Inf when nothing is due
	high bool
}

var never = event{at: math.Inf(1)}

// New starts a simulation of a board, or says what is wrong with it.
func New(b Board) (*Sim, error) {
	s := &Sim{turn: never, release: never, fineness: 1, stride: 1e-6, loadStride: 1e-6}
	s.seg.sim = s
	s.cycle.reset()
	if err := s.adopt(b); err != nil {
		return nil, err
	}
	s.x.Winding = s.ambient
	s.rebuild()
	return s, nil
}

func (s *Sim) adopt(b Board) error {
	if b.Ambient == 0 {
		b.Ambient = Nominal
	}
	if err := errors.Join(b.check(), within("ambient temperature", b.Ambient, 200, 450)); err != nil {
		return err
	}
	if b.Timing.Pot == PotWiper && s.pot > b.Timing.PotTrack {
		return fmt.Errorf("circuit: the pot stands at %g ohm; a track of %g ohm is too short", s.pot, b.Timing.PotTrack)
	}
	s.b, s.ambient = b, b.Ambient
	return nil
}

// rebuild derives from the board, pot and temperature what the steps use.
func (s *Sim) rebuild() {
	t := &s.b.Timing
	s.common = t.Common
	if t.Pot == PotCommon {
		s.common += s.pot
	}
	s.net.build(t, s.pot, s.ambient)
	s.clamp = s.b.Timer.Clamp.forward(s.ambient)
	if s.b.Flyback != nil {
		s.flyback = s.b.Flyback.forward(s.ambient)
	}
	if s.b.Driver.Body != nil {
		s.body = s.b.Driver.Body.forward(s.ambient)
	}
	s.disturb()
}

// disturb forgets what was known of the steady state.
func (s *Sim) disturb() {
	s.reference = math.NaN()
	s.cycle.reset()
}

// SetSupply sets the supply's voltage in V, at or above 0.
func (s *Sim) SetSupply(v float64) error {
	if !(v >= 0) || math.IsInf(v, 0) {
		return fmt.Errorf("circuit: supply voltage is %g V; it must be at or above 0", v)
	}
	s.set = v
	s.disturb()
	return nil
}

// SetLimit sets the supply's current limit in A, at or above 0.
func (s *Sim) SetLimit(a float64) error {
	if !(a >= 0) || math.IsInf(a, 0) {
		return fmt.Errorf("circuit: current limit is %g A; it must be at or above 0", a)
	}
	s.limit = a
	s.disturb()
	return nil
}

// SetOutput switches the supply's output. Off, the board runs down by itself.
func (s *Sim) SetOutput(on bool) {
	s.enabled = on
	s.disturb()
}

// SetPot sets the pot's resistance in ohm, wiper resistance included; for the
// wiper network, the ohms between wiper and charging end.
func (s *Sim) SetPot(ohms float64) error {
	t := &s.b.Timing
	if !(ohms >= 0) || math.IsInf(ohms, 0) {
		return fmt.Errorf("circuit: pot is %g ohm; it must be at or above 0", ohms)
	}
	if t.Pot == PotWiper && ohms > t.PotTrack {
		return fmt.Errorf("circuit: pot is %g ohm; its track has %g ohm", ohms, t.PotTrack)
	}
	s.pot = ohms
	s.rebuild()
	return nil
}

// SetShort puts a resistance across the board's supply; +Inf takes it away.
func (s *Sim) SetShort(ohms float64) error {
	if !(ohms > 0) {
		return fmt.Errorf("circuit: short is %g ohm; it must be above 0, +Inf for none", ohms)
	}
	s.short = 1 / ohms
	s.disturb()
	return nil
}

// SetLocked blocks the rotor, or lets it go.
func (s *Sim) SetLocked(locked bool) {
	if s.locked = locked; locked {
		s.x.Speed, s.turning = 0, false
	}
	s.disturb()
}

// SetAmbient sets the temperature of everything but the winding's own rise, K.
func (s *Sim) SetAmbient(kelvin float64) error {
	if err := within("ambient temperature", kelvin, 200, 450); err != nil {
		return err
	}
	if s.b.Load.ThermalResistance == 0 {
		s.x.Winding = kelvin
	}
	s.b.Ambient, s.ambient = kelvin, kelvin
	s.rebuild()
	return nil
}

// Change alters true values while the board lives: drift, a part replaced.
// A board that check refuses leaves everything as it was.
func (s *Sim) Change(alter func(*Board)) error {
	b := s.b
	alter(&b)
	if err := s.adopt(b); err != nil {
		return err
	}
	s.rebuild()
	return nil
}

// Now is the simulated time, s.
func (s *Sim) Now() float64 { return s.x.Time }

// State is the board as it is now.
func (s *Sim) State() State { return s.x }

// Board gives the true values in force.
func (s *Sim) Board() Board { return s.b }

// High tells whether the timer's output is high.
func (s *Sim) High() bool { return s.high }

// Winding is the load's resistance at its present temperature, ohm; what an
// ohmmeter across it reads while the board has no power.
func (s *Sim) Winding() float64 {
	if s.b.Load.Kind == Motor {
		return s.winding()
	}
	return s.b.Load.Resistance
}

// Limiting tells whether the supply holds its current rather than its voltage.
func (s *Sim) Limiting() bool { return s.enabled && s.region == current }

// Look gives what a probe sees at this instant, V or A.
func (s *Sim) Look(p Probe) float64 {
	s.seg.freeze()
	return s.seg.see(p, &s.x)
}
