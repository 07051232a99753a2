package driver

import (
	"context"
	"fmt"
	"slices"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// Scope takes single records.
type Scope struct {
	instrument
	set  instruments.ScopeSettings // in force; no channels before Configure
	turn int                       // which channel is read back before the next record
}

var _ instruments.Scope = (*Scope)(nil)

// OpenScope makes the driver, brings the scope to a known state and sets the format of its records.
func OpenScope(ctx context.Context, conn *scpi.Conn, d *dialect.Dialect, o Options) (*Scope, []string, error) {
	s := &Scope{instrument: newInstrument(conn, d, o)}
	notes, err := s.open(ctx)
	if err == nil {
		err = s.reset(ctx)
	}
	for _, name := range []string{"format", "byte_order"} {
		if err == nil && s.has(name) {
			err = s.ensure(ctx, name, s.put(0))
		}
	}
	if err == nil {
		err = s.clean(ctx, "opening")
	}
	if err != nil {
		return nil, notes, err
	}
	return s, notes, nil
}

// Configure sets channels, time base and trigger, and answers what is in force.
func (s *Scope) Configure(ctx context.Context, want instruments.ScopeSettings) (instruments.ScopeSettings, error) {
	s.set = instruments.ScopeSettings{}
	if err := s.possible(want); err != nil {
		return s.set, err
	}
	got := instruments.ScopeSettings{Channels: slices.Clone(want.Channels), Trigger: want.Trigger}
	for n := range got.Channels {
		if err := s.setChannel(ctx, &got.Channels[n]); err != nil {
			return s.set, err
		}
	}
	var err error
	if got.Points, err = s.setPoints(ctx, want.Points); err != nil {
		return s.set, err
	}
	if got.Duration, err = s.setDuration(ctx, want.Duration); err != nil {
		return s.set, err
	}
	if err := s.setTrigger(ctx, &got.Trigger); err != nil {
		return s.set, err
	}
	if err := s.clean(ctx, "set-up"); err != nil {
		return s.set, err
	}
	s.set = got
	if err := s.same(ctx, got.Channels); err != nil { // what was set later may have moved what was set first
		return s.set, fmt.Errorf("after all was set: %w", err)
	}
	s.shaken.Store(false)
	return got, nil
}

// possible refuses settings that mean nothing, before anything is sent.
func (s *Scope) possible(want instruments.ScopeSettings) error {
	bad := func(format string, args ...any) error {
		return fmt.Errorf("%s: %w: %s", s.name, ErrRefused, fmt.Sprintf(format, args...))
	}
	trigger := false
	for _, c := range want.Channels {
		if !(c.High > c.Low) {
			return bad("channel %d from %g V to %g V has no height", c.Number, c.Low, c.High)
		}
		trigger = trigger || c.Number == want.Trigger.Channel
	}
	most := s.d.Waveform.MostPoints
	if s.d.Waveform.Points > 0 || len(s.d.Commands["points"].Choices) > 0 {
		most = want.Points // it has its own counts, and answers which is in force
	}
	switch {
	case len(want.Channels) == 0:
		return bad("no channel is to be recorded")
	case !trigger:
		return bad("the trigger's channel %d is not recorded", want.Trigger.Channel)
	case want.Points < 2 || want.Points > most:
		return bad("%d points; it records 2 to %d", want.Points, most)
	case !(want.Duration > 0):
		return bad("a record of %g s", want.Duration)
	}
	return nil
}

// setTrigger makes the positive-going crossing of a level the trigger.
func (s *Scope) setTrigger(ctx context.Context, t *instruments.ScopeTrigger) (err error) {
	p := s.d.Put(t.Level, t.Channel)
	if err := s.ensureEach(ctx, p, "trigger_source", "trigger_slope", "trigger_wait"); err != nil {
		return err
	}
	l, found, err := s.assign(ctx, "trigger_level", p)
	if err != nil {
		return err
	}
	if !l.Agrees(t.Level, found) {
		return s.refused(ctx, p.Fill(l.Send), si.Format(found, si.Volt))
	}
	t.Level = found
	return nil
}

// Capture takes one new record of all channels configured. Where no trigger
// comes in time it takes one untriggered record and says so.
func (s *Scope) Capture(ctx context.Context) ([]instruments.Waveform, error) {
	if len(s.set.Channels) == 0 {
		return nil, fmt.Errorf("%s: %w", s.name, ErrNotConfigured)
	}
	if err := s.verify(ctx); err != nil {
		return nil, err
	}
	s.shaken.Store(false)
	triggered, err := s.acquire(ctx)
	if err != nil {
		return nil, err
	}
	if s.d.Waveform.NeedsStop {
		if err := s.ensure(ctx, "stop", s.put(0)); err != nil {
			return nil, err
		}
	}
	at := s.clock.Now()
	var waves []instruments.Waveform
	for _, c := range s.set.Channels {
		w, err := s.fetch(ctx, c)
		if err != nil {
			return nil, err
		}
		w.Triggered, w.At = triggered, at
		waves = append(waves, w)
	}
	return waves, nil
}

// high and wide are the divisions of the screen; 1 where it has none.
func (s *Scope) high() float64 {
	if s.d.Screen == nil {
		return 1
	}
	return s.d.Screen.Divisions
}

func (s *Scope) wide() float64 {
	if s.d.Screen == nil {
		return 1
	}
	return s.d.Screen.TimeDivisions
}
