package instruments

import (
	"context"
	"errors"
	"fmt"
	"time"

	"nightbench/instruments/si"
)

// SafeSpec says what safe means on this bench and how patient to be. Zero
// fields mean the defaults.
type SafeSpec struct {
	Below si.Voltage    // the output counts as off below this; default 0.5 V
	Coast time.Duration // bench time a coasting motor may hold the node up; default 10 s
	Step  time.Duration // wall time of one step; default 5 s
	Again time.Duration // wall time between two passes; default 1 s
	Words string        // unconfirmed: which switch to turn by hand
	Log   func(string)  // hears each failure as it happens; may be nil
}

func (s SafeSpec) withDefaults() SafeSpec {
	if s.Below.SI() <= 0 {
		s.Below = si.Volts(0.5)
	}
	if s.Coast <= 0 {
		s.Coast = 10 * time.Second
	}
	if s.Step <= 0 {
		s.Step = 5 * time.Second
	}
	if s.Again <= 0 {
		s.Again = time.Second
	}
	if s.Words == "" {
		s.Words = "Switch the supply off by hand: its output key, or its mains switch."
	}
	if s.Log == nil {
		s.Log = func(string) {}
	}
	return s
}

// OffReport is the outcome of making a bench safe. Confirmed means that the
// supply says its output is off and a voltage below Below was read back at its
// terminals, and that no second witness says otherwise.
type OffReport struct {
	Confirmed bool
	By        []string // witnesses: "supply", "meter average"
	Voltage   *float64 // V, last read at the supply's terminals
	Below     float64  // V
	At        time.Time
	Parked    bool   // the pot is at its park code, or there is none
	Words     string // what was seen; unconfirmed: what to do by hand
	Err       error  // every step of the last pass that failed, joined
}

// MakeSafe switches the output off and confirms it, in the order of the trade:
// off sent blind; cutoff open; off again, in step and read back; second
// witness; pot parked; waiting for a coasting motor. A step that fails holds
// up none of the others. Unconfirmed, it starts again for as long as ctx
// allows. The first pass up to the first look at the supply is made whatever
// the state of ctx, since a cancelled context is no reason to leave a board energised.
func MakeSafe(ctx context.Context, clock Clock, b Bench, spec SafeSpec) OffReport {
	s := &safing{clock: clock, bench: b, spec: spec.withDefaults(), logged: map[string]string{}, heard: map[string]float64{}}
	must := context.WithoutCancel(ctx)
	for {
		before := s.report
		s.pass(must, ctx)
		if must == ctx && ctx.Err() != nil && !s.report.Confirmed {
			return before // a pass cut short knows less than the one before it
		}
		if s.report.Confirmed || clock.Wait(ctx, s.spec.Again) != nil {
			return s.report
		}
		must = ctx
	}
}

// safing is one making safe.
type safing struct {
	clock  Clock
	bench  Bench
	spec   SafeSpec
	report OffReport
	errs   []error
	logged map[string]string  // the last failure of each step, so that a night of them is one line
	heard  map[string]float64 // V, what each meter last said
}

// pass goes through all steps once. What cuts power runs under must, what only
// waits or looks again under ctx.
func (s *safing) pass(must, ctx context.Context) {
	s.errs = nil
	parked := s.report.Parked
	s.report = OffReport{Below: s.spec.Below.SI(), Parked: parked}
	s.step(must, "output off, sent blind", func(ctx context.Context) error { return s.supply().Off(ctx) })
	s.step(must, "cutoff open", s.openCutoff)
	s.step(must, "output off, read back", func(ctx context.Context) error { return s.supply().SetOutput(ctx, false) })
	state, seen := s.look(must)
	if !parked {
		s.report.Parked = s.step(must, "park the pot", s.park)
	}
	s.coast(ctx, state, seen)
	s.report.Err = errors.Join(s.errs...)
}

// step runs one step in a context of its own; a panic in it is an error too.
func (s *safing) step(ctx context.Context, name string, do func(context.Context) error) (ok bool) {
	ctx, cancel := context.WithTimeout(ctx, s.spec.Step)
	defer cancel()
	defer func() {
		if p := recover(); p != nil {
			ok = s.failed(name, fmt.Errorf("panic: %v", p))
		}
	}()
	if err := do(ctx); err != nil {
		return s.failed(name, err)
	}
	return true
}

// failed notes a failure and is always false.
func (s *safing) failed(name string, err error) bool {
	err = fmt.Errorf("making safe: %s: %w", name, err)
	s.errs = append(s.errs, err)
	if words := err.Error(); s.logged[name] != words {
		s.logged[name] = words
		s.spec.Log(words)
	}
	return false
}

func (s *safing) supply() Supply {
	if s.bench.Supply == nil {
		return NoSupply
	}
	return s.bench.Supply
}

// openCutoff cuts the second way; a bench without one is no failure.
func (s *safing) openCutoff(ctx context.Context) error {
	if s.bench.Cutoff == nil {
		return nil
	}
	if err := s.bench.Cutoff.Open(ctx); !errors.Is(err, ErrAbsent) {
		return err
	}
	return nil
}

// park sends the pot to its safe code; a bench without one is no failure.
func (s *safing) park(ctx context.Context) error {
	if s.bench.Pot == nil || s.bench.Wiring.Pot == nil {
		return nil
	}
	if err := s.bench.Pot.SetCode(ctx, s.bench.Wiring.Pot.Park); !errors.Is(err, ErrAbsent) {
		return err
	}
	return nil
}

// look reads the supply's state.
func (s *safing) look(ctx context.Context) (state SupplyState, seen bool) {
	seen = s.step(ctx, "read the supply back", func(ctx context.Context) (err error) {
		state, err = s.supply().State(ctx)
		return err
	})
	return state, seen
}

// lookEvery is the bench time between two looks while a motor coasts.
const lookEvery = 200 * time.Millisecond

// coast looks until all witnesses agree, at most as long as a motor may coast.
func (s *safing) coast(ctx context.Context, state SupplyState, seen bool) {
	began := s.clock.Elapsed()
	for {
		s.judge(ctx, state, seen)
		if s.report.Confirmed || !seen || s.clock.Elapsed()-began >= s.spec.Coast || s.clock.Sleep(ctx, lookEvery) != nil {
			return
		}
		if state, seen = s.look(ctx); !seen && ctx.Err() == nil {
			state, seen = s.look(ctx) // one bad reply is no reason to give up waiting
		}
		if ctx.Err() != nil {
			return
		}
	}
}
