package link

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"time"
)

// Clear makes the instrument forget what it was about to say, in the way its
// link or family has, and throws away what it says until it has been quiet for
// the quiet time. It returns what it threw away, at most the first 256 bytes.
func (t *Turn) Clear(ctx context.Context) (dropped []byte, err error) {
	limit := time.NewTimer(t.l.opt.ClearLimit)
	defer limit.Stop()
	quiet, err := t.deviceClear(ctx)
	if err != nil {
		return nil, t.spoilt("clear", err)
	}
	answered := t.l.opt.ClearReply == ""
	for {
		answered = answered || bytes.Contains(t.l.buf, []byte(t.l.opt.ClearReply))
		dropped = clip(append(dropped, t.l.buf...))
		if answered {
			t.l.buf = nil
		}
		still := time.NewTimer(quiet)
		err := t.more(ctx, still.C)
		still.Stop()
		switch {
		case err == nil:
		case errors.Is(err, ErrTimeout) && ctx.Err() == nil && answered:
			t.l.stale.Store(false)
			return clip(dropped), nil
		case errors.Is(err, ErrTimeout) && ctx.Err() == nil:
		default:
			return clip(dropped), t.spoilt("clear", err)
		}
		select {
		case <-limit.C:
			return clip(dropped), t.spoilt("clear", t.unclear(answered, dropped))
		default:
		}
	}
}

// unclear says why clearing came to no end.
func (t *Turn) unclear(answered bool, dropped []byte) error {
	if !answered {
		return fmt.Errorf("%w: its device clear was not answered by %q", ErrTimeout, t.l.opt.ClearReply)
	}
	return fmt.Errorf("%w: %q…", ErrBabble, clip(dropped))
}

// deviceClear sends the instrument's device clear, if it has any, and says how
// long it then must be silent to count as drained.
func (t *Turn) deviceClear(ctx context.Context) (quiet time.Duration, err error) {
	quiet = t.l.opt.Quiet
	w := t.l.wire.Load()
	if w == nil {
		return quiet, ErrLost
	}
	if c, ok := w.rw.(clearer); ok {
		return messageQuiet, t.clearMessages(ctx, w, c)
	}
	if t.l.opt.ClearBreak {
		if b, ok := w.rw.(breaker); ok {
			if err := b.Break(); err != nil {
				return quiet, fmt.Errorf("send a break: %w", err)
			}
		}
	}
	if b := t.l.opt.ClearBytes; len(b) > 0 {
		return quiet, t.l.ended(w.send(ctx, b))
	}
	return quiet, nil
}

// clearMessages has a stream of messages cleared, and takes what still comes
// meanwhile, so that the clear's own answer is not held up behind it.
func (t *Turn) clearMessages(ctx context.Context, w *wire, c clearer) error {
	ctx, cancel := context.WithTimeout(ctx, t.l.opt.ClearLimit)
	defer cancel()
	done := make(chan error, 1)
	go func() { done <- c.Clear(ctx) }()
	for {
		select {
		case err := <-done:
			return err
		case _, more := <-w.in:
			if !more {
				cancel()
				<-done
				return t.l.ended(w.err)
			}
		}
	}
}

// messageQuiet is left for what was on its way from the reading goroutine
// before a device clear that is itself the proof.
const messageQuiet = time.Millisecond

// clip shortens bytes for a message.
func clip(b []byte) []byte { return b[:min(len(b), 256)] }
