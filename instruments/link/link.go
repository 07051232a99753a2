// Package link is a byte stream to one instrument, over a serial line, TCP,
// USBTMC or HiSLIP, with one talker at a time.
//
// A Link is held in turns: whoever has the Turn sends and reads, everybody
// else waits. Two goroutines move the bytes, so a blocked read or write never
// blocks a caller beyond its context and the link's own time-outs. A fault is
// an *Error whose cause is one of ErrTimeout, ErrLost, ErrClosed and so on.
//
// The link knows lines and byte counts. What the bytes mean, and how to prove
// after a time-out that replies belong to their questions, is package scpi's
// affair.
package link

import (
	"cmp"
	"context"
	"errors"
	"sync/atomic"
	"time"
)

// Link is an open stream to one instrument. All methods may be called from
// any goroutine.
type Link struct {
	addr   Address
	opt    Options
	turn   chan struct{}   // one slot: full when nobody holds the link
	life   context.Context // ends when Close begins
	kill   context.CancelCauseFunc
	done   chan struct{} // closed when Close has ended
	ending atomic.Bool
	end    error // Close's result; read only after done is closed

	wire  atomic.Pointer[wire] // the stream in use; nil when lost for good
	torn  atomic.Bool          // part of a line may have left: start afresh with a terminator
	stale atomic.Bool          // an exchange failed: replies may be on their way
	buf   []byte               // received and not yet used; touched only by the holder of the turn
}

// Open opens the stream. The context bounds the opening only.
func Open(ctx context.Context, a Address, opt Options) (*Link, error) {
	l := &Link{addr: a, opt: opt.withDefaults(), turn: make(chan struct{}, 1), done: make(chan struct{})}
	l.life, l.kill = context.WithCancelCause(context.WithoutCancel(ctx))
	rw, err := l.opt.Dial(ctx, a)
	if err != nil {
		l.kill(err)
		return nil, l.fault("open", err)
	}
	l.wire.Store(newWire(rw, &l.opt))
	l.turn <- struct{}{}
	return l, nil
}

// Address is where the link leads.
func (l *Link) Address() Address { return l.addr }

// Timeout is the time allowed for one reply.
func (l *Link) Timeout() time.Duration { return l.opt.Timeout }

// Close ends the link. A read or write in progress returns ErrClosed. Close
// waits for the link's goroutines, at most two seconds: what is still stuck
// in the system then is abandoned and reported. Further calls return the same
// result.
func (l *Link) Close() error {
	if !l.ending.CompareAndSwap(false, true) {
		<-l.done
		return l.end
	}
	l.kill(ErrClosed)
	if w := l.wire.Load(); w != nil {
		if err := w.shut(); err != nil {
			l.end = l.fault("close", err)
		}
	}
	close(l.done)
	return l.end
}

// fault wraps err once; an *Error stays as it is.
func (l *Link) fault(op string, err error) error {
	var e *Error
	if err == nil || errors.As(err, &e) {
		return err
	}
	return &Error{Op: op, Address: l.addr.String(), Hint: cmp.Or(remedy(l.addr, err), hintFor(err)), Err: err}
}

// Acquire waits for the link to be free and takes it. Release must follow.
func (l *Link) Acquire(ctx context.Context) (*Turn, error) {
	select { // closed and cancelled win over free
	case <-l.life.Done():
		return nil, l.fault("wait for", ErrClosed)
	case <-ctx.Done():
		return nil, l.fault("wait for", ended(ctx))
	default:
	}
	select {
	case <-l.turn:
		return &Turn{Timeout: l.opt.Timeout, l: l}, nil
	case <-l.life.Done():
		return nil, l.fault("wait for", ErrClosed)
	case <-ctx.Done():
		return nil, l.fault("wait for", ended(ctx))
	}
}

// with runs fn in a turn of its own.
func (l *Link) with(ctx context.Context, fn func(*Turn) error) error {
	t, err := l.Acquire(ctx)
	if err != nil {
		return err
	}
	defer t.Release()
	return fn(t)
}

// Send sends one line that has no reply.
func (l *Link) Send(ctx context.Context, line string) error {
	return l.with(ctx, func(t *Turn) error { return t.Send(ctx, line) })
}

// Query sends one line and reads one line back. When an earlier exchange
// failed, or bytes nobody asked for are waiting, the link is cleared first;
// that a reply then belongs to its question is likely, not proven. Talk
// through scpi.Conn where a query can tell.
func (l *Link) Query(ctx context.Context, line string) (reply string, err error) {
	err = l.with(ctx, func(t *Turn) error {
		if l.stale.Load() || len(t.Waiting()) > 0 {
			if _, err := t.Clear(ctx); err != nil {
				return err
			}
		}
		if err := t.Send(ctx, line); err != nil {
			return err
		}
		reply, err = t.ReadLine(ctx)
		return err
	})
	return reply, err
}

// Clear throws away what the instrument has said, until it is quiet.
func (l *Link) Clear(ctx context.Context) error {
	return l.with(ctx, func(t *Turn) error { _, err := t.Clear(ctx); return err })
}

// Reopen closes the stream and opens it anew.
func (l *Link) Reopen(ctx context.Context) error {
	return l.with(ctx, func(t *Turn) error { return t.Reopen(ctx) })
}
