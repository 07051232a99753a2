package predict

import (
	"fmt"
	"math"
)

// Start is what a motor does from rest at a setting, and whether it could go on running.
type Start struct {
	Twitches bool    `json:"twitches"` // peak torque overcomes static friction
	Keeps    bool    `json:"keeps"`    // and mean torque at rest overcomes sliding friction
	Runs     bool    `json:"runs"`     // there is a speed at which it would go on turning
	Peak     float64 `json:"peak"`     // N·m, locked
	Mean     float64 `json:"mean"`     // N·m, locked
}

// Starts tells whether it turns from rest and goes on.
func (s Start) Starts() bool { return s.Twitches && s.Keeps }

// Start computes it for the nominal board. A board without a motor, one that does
// not oscillate, or a setting that cannot be is an error.
func (m *Model) Start(s Setting) (Start, error) {
	if err := m.checkSetting(s); err != nil {
		return Start{}, fmt.Errorf("board %q: %w", m.board.Name, err)
	}
	o := m.solve(&m.nominal, s.conditions())
	switch {
	case m.nominal.load.k == 0:
		return Start{}, fmt.Errorf("board %q: the load is a %s, it has nothing to start", m.board.Name, m.board.Load.Kind)
	case o.stop != oscillates:
		return Start{}, fmt.Errorf("board %q: %s", m.board.Name, m.flags(&o, s)[0].Words)
	}
	held := m.locked(&m.nominal, s.conditions(), &o)
	l := &m.nominal.load
	twitches, keeps := l.starts(&held.wave)
	return Start{twitches, keeps, !o.stalled, l.k * held.wave.peak, l.k * held.wave.current()}, nil
}

// Thresholds are the pot settings at which the motor just starts from rest, and at
// which it just goes on running.
type Thresholds struct {
	Start *float64 `json:"start"` // nil: it starts everywhere or nowhere in the range
	Stall *float64 `json:"stall"`
	Words string   `json:"words"`
}

// coincident is how near two thresholds are to be one, relative.
const coincident = 1e-3

// words says what the two mean together.
func (t *Thresholds) words() string {
	switch {
	case t.Start == nil && t.Stall == nil:
		return "the motor neither starts nor stalls anywhere between"
	case t.Start == nil:
		return "the motor stalls, but starts from rest everywhere or nowhere between"
	case t.Stall == nil:
		return "the motor goes on running, or stands, all the way between"
	case math.Abs(*t.Start / *t.Stall - 1) < coincident:
		return "start and stall coincide: no hysteresis is to be expected"
	}
	return "between the two thresholds the motor goes on running but does not start from rest"
}

// Thresholds bisects between two pot settings (as in Setting.Pot), at the rest of s.
func (m *Model) Thresholds(s Setting, from, to float64) (Thresholds, error) {
	at := func(pot float64) (Start, error) { s.Pot = pot; return m.Start(s) }
	var out Thresholds
	var err error
	if out.Start, err = flips(from, to, at, Start.Starts); err != nil {
		return Thresholds{}, err
	}
	if out.Stall, err = flips(from, to, at, func(s Start) bool { return s.Runs }); err != nil {
		return Thresholds{}, err
	}
	out.Words = out.words()
	return out, nil
}

// flips finds where a yes turns to no, to a millionth; nil where both ends say the same.
func flips(a, b float64, at func(float64) (Start, error), is func(Start) bool) (*float64, error) {
	first, err := at(a)
	if err != nil {
		return nil, err
	}
	last, err := at(b)
	if err != nil || is(first) == is(last) {
		return nil, err
	}
	for math.Abs(b-a) > 1e-6*math.Max(math.Abs(a), math.Abs(b)) {
		mid := (a + b) / 2
		s, err := at(mid)
		if err != nil {
			return nil, err
		}
		if is(s) == is(first) {
			a = mid
		} else {
			b = mid
		}
	}
	x := (a + b) / 2
	return &x, nil
}

// Tau is the motor's mechanical time constant J·R/K², s; 0 where no inertia is given or nothing turns.
func (m *Model) Tau() float64 { return m.nominal.load.tau(0) }

// Peak bounds the load's current at a supply voltage, A: the rotor held, the driver
// always on and without any drop.
func (m *Model) Peak(supply float64) float64 {
	return math.Max(0, supply-m.nominal.load.brush) / m.nominal.load.r
}
