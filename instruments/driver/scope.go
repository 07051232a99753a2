package driver

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// Scope takes single records.
type Scope struct {
	instrument
	set instruments.ScopeSettings // in force; no channels before Configure
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
	points, err := s.instrument.set(ctx, "points", s.put(float64(want.Points)), si.One)
	if err != nil {
		return s.set, err
	}
	got.Points = int(points)
	if got.Duration, err = s.instrument.set(ctx, "duration", s.put(want.Duration), si.Second); err != nil {
		return s.set, err
	}
	if err := s.setTrigger(ctx, &got.Trigger); err != nil {
		return s.set, err
	}
	if err := s.clean(ctx, "set-up"); err != nil {
		return s.set, err
	}
	s.shaken.Store(false)
	s.set = got
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
	switch most := s.d.Waveform.MostPoints; {
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

// setChannel couples a channel DC, tells it the probe, and sets its screen.
func (s *Scope) setChannel(ctx context.Context, c *instruments.ScopeChannel) (err error) {
	p := func(v float64) dialect.Put { return dialect.Put{Value: v, Channel: c.Number} }
	if s.has("coupling") {
		if err := s.ensure(ctx, "coupling", p(0)); err != nil {
			return err
		}
	}
	if c.Probe > 0 && (s.has("probe") || c.Probe != 1) {
		if c.Probe, err = s.instrument.set(ctx, "probe", p(c.Probe), si.One); err != nil {
			return err
		}
	}
	height := c.High - c.Low
	if c.High, err = s.edge(ctx, "range_high", p(c.High), height); err != nil {
		return err
	}
	c.Low, err = s.edge(ctx, "range_low", p(c.Low), height)
	return err
}

// edge sets one end of the screen. Its departure is judged against the height
// of the screen, since an end may be 0 V.
func (s *Scope) edge(ctx context.Context, name string, p dialect.Put, height float64) (float64, error) {
	l, found, err := s.assign(ctx, name, p)
	if err != nil {
		return 0, err
	}
	if off := found - p.Value; max(off, -off) > max(l.Within, 1e-6)*height {
		return 0, s.refused(ctx, p.Fill(l.Send), si.Format(found, si.Volt))
	}
	return found, nil
}

// setTrigger makes the positive-going crossing of a level the trigger.
func (s *Scope) setTrigger(ctx context.Context, t *instruments.ScopeTrigger) (err error) {
	p := dialect.Put{Value: t.Level, Channel: t.Channel}
	if err := s.ensure(ctx, "trigger_source", p); err != nil {
		return err
	}
	if s.has("trigger_slope") {
		if err := s.ensure(ctx, "trigger_slope", p); err != nil {
			return err
		}
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
	if s.shaken.Load() {
		if err := s.verify(ctx); err != nil {
			return nil, err
		}
		s.shaken.Store(false)
	}
	triggered, err := s.acquire(ctx)
	if err != nil {
		return nil, err
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

// acquire takes a triggered record, or else an automatic one.
func (s *Scope) acquire(ctx context.Context) (triggered bool, err error) {
	err = s.start(ctx, s.triggerTime())
	if err == nil || !errors.Is(err, link.ErrTimeout) || ctx.Err() != nil {
		return err == nil, err
	}
	if err := s.abandon(ctx); err != nil {
		return false, err
	}
	trigger := dialect.Put{Value: s.set.Trigger.Level, Channel: s.set.Trigger.Channel}
	if err := s.ensure(ctx, "trigger_none", trigger); err != nil {
		return false, err
	}
	if err := s.start(ctx, s.base()+s.recordTime()); err != nil {
		return false, err
	}
	s.shaken.Store(false) // a trigger that does not come is no failure
	return false, s.ensure(ctx, "trigger_source", trigger)
}

// start begins a record and waits until it is complete, at most for limit.
func (s *Scope) start(ctx context.Context, limit time.Duration) error {
	l, err := s.line("start")
	if err != nil {
		return err
	}
	if err := s.tell(ctx, l, s.put(0)); err != nil {
		return err
	}
	waiting := *s
	waiting.conn = s.conn.Within(limit)
	if s.d.Completion != nil && s.d.Completion.Style == "polled" {
		var cancel context.CancelFunc
		ctx, cancel = context.WithTimeoutCause(ctx, limit, link.ErrTimeout)
		defer cancel()
	}
	if err := waiting.done(ctx); err != nil {
		return s.fault(s.put(0).Fill(l.Send), err)
	}
	return nil
}

// abandon gives up a record that no trigger came for. It is sent without
// getting in step first, since the reply that step waits for is being held back.
func (s *Scope) abandon(ctx context.Context) error {
	l, err := s.line("abort")
	if err != nil {
		return err
	}
	if err := s.conn.Blind(ctx, l.Send); err != nil {
		return s.fault(l.Send, err)
	}
	if err := s.conn.Resync(ctx); err != nil {
		return s.fault(l.Send, err)
	}
	return nil
}

// verify reads back settings that a reset would change, after the connection
// was out of step.
func (s *Scope) verify(ctx context.Context) error {
	first := s.set.Channels[0]
	for _, want := range []struct {
		name  string
		value float64
		unit  si.Unit
	}{{"duration", s.set.Duration, si.Second}, {"points", float64(s.set.Points), si.One}, {"range_high", first.High, si.Volt}} {
		l, err := s.line(want.name)
		if err != nil {
			return err
		}
		p := dialect.Put{Channel: first.Number}
		found, err := s.measured(ctx, l, p)
		if err != nil {
			return err
		}
		if !l.Agrees(want.value, found) {
			s.set = instruments.ScopeSettings{}
			return &Error{Instrument: s.name, Command: p.Fill(l.Ask), Found: si.Format(found, want.unit), Err: ErrSettingsLost,
				Try: "was it switched off and on? configure it again"}
		}
	}
	return nil
}
