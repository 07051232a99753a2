package driver

import (
	"context"
	"errors"
	"fmt"
	"time"

	"nightbench/instruments/link"
)

// acquire takes a triggered record, or else an automatic one.
func (s *Scope) acquire(ctx context.Context) (triggered bool, err error) {
	err = s.start(ctx, s.triggerTime(), false)
	if err == nil || !errors.Is(err, link.ErrTimeout) || ctx.Err() != nil {
		return err == nil, err
	}
	if err := s.abandon(ctx); err != nil {
		return false, err
	}
	trigger := s.d.Put(s.set.Trigger.Level, s.set.Trigger.Channel)
	if err := s.ensureEach(ctx, trigger, "trigger_none"); err != nil {
		return false, err
	}
	if err := s.start(ctx, s.base()+s.recordTime(), true); err != nil {
		return false, err
	}
	s.shaken.Store(false) // a trigger that does not come is no failure
	return false, s.ensureEach(ctx, trigger, "trigger_source", "trigger_wait")
}

// start begins a record and waits until it is complete, at most for limit. The
// trigger is forced where that is wanted and the dialect has a line for it.
func (s *Scope) start(ctx context.Context, limit time.Duration, force bool) error {
	if err := s.ensureEach(ctx, s.put(0), "single"); err != nil {
		return err
	}
	l, err := s.line("start")
	if err != nil {
		return err
	}
	if err := s.tell(ctx, l, s.put(0)); err != nil {
		return err
	}
	if force && s.has("force") {
		if err := s.tell(ctx, s.d.Commands["force"], s.put(0)); err != nil {
			return err
		}
	}
	switch c := s.d.Completion; {
	case s.has("acquired"):
		return s.acquired(ctx, limit)
	case c != nil && c.Style == "polled":
		var cancel context.CancelFunc
		ctx, cancel = context.WithTimeoutCause(ctx, limit, link.ErrTimeout)
		defer cancel()
	case c == nil || c.Style == "dwell":
		if err := s.clock.Wait(ctx, s.recordTime()); err != nil { // the dwell comes on top
			return err
		}
	}
	waiting := *s
	waiting.conn = s.conn.Within(limit)
	if err := waiting.done(ctx); err != nil {
		return s.fault(s.put(0).Fill(l.Send), err)
	}
	return nil
}

// acquired asks again and again for the scope's own word on its record.
func (s *Scope) acquired(ctx context.Context, limit time.Duration) error {
	for until := s.clock.Now().Add(limit); ; {
		done, err := s.flag(ctx, "acquired")
		if err != nil || done {
			return err
		}
		if s.clock.Now().After(until) {
			return &Error{Instrument: s.name, Command: s.d.Commands["acquired"].Ask, Err: fmt.Errorf("%w: no record within %v", link.ErrTimeout, limit)}
		}
		if err := s.clock.Wait(ctx, pollEvery); err != nil {
			return err
		}
	}
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
