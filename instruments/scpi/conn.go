// Package scpi speaks and understands IEEE 488.2 messages with SCPI headers.
//
// The speaking side is Conn: commands and queries over a link, with the rule
// that a reply which may belong to an earlier question is never used. The
// listening side, for simulated instruments, is Device: it splits a stream
// into messages, parses them by the standard's grammar, dispatches them
// through a Tree of headers, and keeps the status registers and error queue.
package scpi

import (
	"context"
	"errors"
	"fmt"
	"sync/atomic"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/link"
)

// Conn talks to one instrument. All methods may be called from any goroutine;
// exchanges take turns. A new Conn is out of step, since an earlier program
// may have left replies behind: its first exchange proves it in step.
type Conn struct {
	*talk
	timeout time.Duration
	rest    time.Duration
}

// talk is what the handles of one connection share. Fields below link belong
// to the holder of the turn, doubts apart.
type talk struct {
	link *link.Link
	opt  Options

	doubts   atomic.Int64  // how often step was put in doubt since it was proven
	identity string        // the remembered reply to the identity query
	unsure   int           // markers sent by the longest proof that failed
	last     time.Time     // end of the latest exchange, for the gap
	rest     time.Duration // what the latest exchange wants after it, beyond the gap
	strays   string        // waiting before the question in hand
}

// New makes a connection over a link, which stays the caller's to close.
func New(l *link.Link, opt Options) *Conn {
	t := &talk{link: l, opt: opt.withDefaults(), identity: opt.Identity}
	t.doubts.Store(1)
	return &Conn{talk: t, timeout: l.Timeout()}
}

// Within is the same connection with another time-out for a reply: long
// enough for a slow reading, say.
func (c *Conn) Within(d time.Duration) *Conn { return &Conn{talk: c.talk, timeout: d, rest: c.rest} }

// Resting is the same connection for exchanges after which the instrument
// needs at least d before it listens again: a reset, an output that comes on.
// Whoever speaks next, on any handle, waits; Blind does not.
func (c *Conn) Resting(d time.Duration) *Conn {
	return &Conn{talk: c.talk, timeout: c.timeout, rest: d}
}

// InStep says whether replies are known to belong to their questions.
func (c *Conn) InStep() bool { return c.doubts.Load() == 0 }

// doubt puts the step in doubt: the next exchange proves it first.
func (t *talk) doubt() { t.doubts.Add(1) }

// Write sends one command that has no reply. That it was sent is not that it
// was understood: read it back, or read Errors.
func (c *Conn) Write(ctx context.Context, command string) error {
	if err := checkMessage(command, false); err != nil {
		return err
	}
	return c.exchange(ctx, command, func(*link.Turn) (string, error) { return "", nil })
}

// Query sends one query and returns its reply without the terminator. After
// any error the connection is out of step, and the next exchange mends that
// first. Outcomes: the reply; link.ErrTimeout; link.ErrLost; ErrOutOfStep
// when step could not be proven, and then nothing was asked; ErrFraming when
// more than one line came back; ErrInterrupted; the context's cause.
func (c *Conn) Query(ctx context.Context, query string) (reply string, err error) {
	if err := checkMessage(query, true); err != nil {
		return "", err
	}
	err = c.exchange(ctx, query, func(t *link.Turn) (string, error) {
		reply, err = t.ReadLine(ctx)
		return reply, err
	})
	if err != nil {
		return "", err
	}
	return reply, nil
}

// Blind sends one command at once: between the parts of another exchange if
// need be, out of step or not, on a new stream if the old one is stuck or
// lost. It waits for no reply and proves nothing. It is for switching an
// output off; whether that worked is another question.
func (c *Conn) Blind(ctx context.Context, command string) error {
	if err := checkMessage(command, false); err != nil {
		return err
	}
	start := c.opt.Now()
	between, err := c.link.Blind(ctx, command)
	if between || err != nil || c.opt.Echo {
		c.doubt()
	}
	c.report(Exchange{Start: start, Command: command, Err: err})
	return c.wrap(command, err)
}

// Identify throws away what is waiting and asks who is there, twice: both
// answers must be the same printable text. It needs to know nothing of the
// instrument and remembers nothing; it is how a dialect is found.
func (c *Conn) Identify(ctx context.Context) (instruments.Identity, error) {
	t, err := c.link.Acquire(ctx)
	if err != nil {
		return instruments.Identity{}, err
	}
	defer t.Release()
	t.Timeout = c.timeout
	c.doubt()
	if _, err := t.Clear(ctx); err != nil {
		return instruments.Identity{}, err
	}
	first, err := c.ask(ctx, t, c.opt.IdentityQuery)
	if err != nil {
		return instruments.Identity{}, err
	}
	again, err := c.ask(ctx, t, c.opt.IdentityQuery)
	switch {
	case err != nil:
		return instruments.Identity{}, err
	case first == c.opt.IdentityQuery && !c.opt.Echo:
		return instruments.Identity{}, c.wrap(c.opt.IdentityQuery,
			fmt.Errorf("%w: it echoes what it is sent; use a dialect that says echo = true, switch the echo off at the instrument, or use its port for programs (5025) rather than the one for people (5024)", ErrFraming))
	case first != again || !printable(first):
		return instruments.Identity{}, c.wrap(c.opt.IdentityQuery,
			fmt.Errorf("%w: it answered %q and then %q%s", ErrFraming, first, again, c.lineTried()))
	}
	return ParseIdentity(first), nil
}

// lineTried says which serial settings were tried.
func (t *talk) lineTried() string {
	if a := t.link.Address(); a.Scheme == "serial" {
		return fmt.Sprintf("; tried %s: are baud rate, parity and stop bits as at the instrument?", a.Line)
	}
	return "; is this its port for programs, and behind a serial server, are baud rate, parity and stop bits right?"
}

// Reopen opens the stream anew and proves it in step with the instrument that
// was there before. Settings may be lost: the caller reads them back.
func (c *Conn) Reopen(ctx context.Context) error {
	t, err := c.link.Acquire(ctx)
	if err != nil {
		return err
	}
	defer t.Release()
	t.Timeout = c.timeout
	c.doubt()
	if err := t.Reopen(ctx); err != nil {
		return err
	}
	return c.resync(ctx, t)
}

// Resync proves the connection in step, mending it first where needed.
func (c *Conn) Resync(ctx context.Context) error {
	t, err := c.link.Acquire(ctx)
	if err != nil {
		return err
	}
	defer t.Release()
	t.Timeout = c.timeout
	return c.ready(ctx, t)
}

// exchange sends one message and lets read take the reply, all in one turn
// and in step, or not at all.
func (c *Conn) exchange(ctx context.Context, message string, read func(*link.Turn) (string, error)) error {
	t, err := c.link.Acquire(ctx)
	if err != nil {
		return c.wrap(message, err)
	}
	defer t.Release()
	t.Timeout = c.timeout
	if err := c.ready(ctx, t); err != nil {
		return c.wrap(message, err)
	}
	if err := c.wait(ctx); err != nil {
		return c.wrap(message, err)
	}
	e := Exchange{Start: c.opt.Now(), Command: message, Strays: c.strays}
	e.Reply, e.Err = c.round(ctx, t, message, read)
	if e.Err != nil {
		c.doubt()
	}
	c.end(e)
	c.talk.rest = c.rest
	return c.wrap(message, e.Err)
}

// round is the exchange proper.
func (c *Conn) round(ctx context.Context, t *link.Turn, message string, read func(*link.Turn) (string, error)) (string, error) {
	if err := t.Send(ctx, message); err != nil {
		return "", err
	}
	if err := c.echo(ctx, t, message); err != nil {
		return "", err
	}
	reply, err := read(t)
	if err != nil {
		return reply, err
	}
	if more := t.Waiting(); len(more) > 0 {
		return reply, fmt.Errorf("%w: %q came, and then %q", ErrFraming, reply, clip(more))
	}
	if c.doubts.Load() != 0 {
		return reply, ErrInterrupted
	}
	return reply, nil
}

// echo takes the line back that an echoing instrument returns.
func (t *talk) echo(ctx context.Context, turn *link.Turn, message string) error {
	if !t.opt.Echo {
		return nil
	}
	back, err := turn.ReadLine(ctx)
	if err == nil && back != message {
		err = fmt.Errorf("%w: the echo was %q", ErrFraming, back)
	}
	return err
}

// wait keeps the instrument's gap, or the longer rest after what was said last.
func (t *talk) wait(ctx context.Context) error {
	gap := max(t.opt.Gap, t.rest)
	d := gap - t.opt.Now().Sub(t.last)
	if gap <= 0 || d <= 0 {
		return nil
	}
	timer := time.NewTimer(min(d, gap))
	defer timer.Stop()
	select {
	case <-timer.C:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	}
}

// end closes the books on one exchange.
func (t *talk) end(e Exchange) {
	t.last, t.rest, t.strays = t.opt.Now(), 0, ""
	t.report(e)
}

func (t *talk) report(e Exchange) {
	if t.opt.OnExchange != nil {
		e.Elapsed = t.opt.Now().Sub(e.Start)
		t.opt.OnExchange(e)
	}
}

// wrap names the message beside the cause.
func (t *talk) wrap(message string, err error) error {
	var e *Error
	if err == nil || errors.As(err, &e) {
		return err
	}
	return &Error{Message: message, Address: t.link.Address().String(), Err: err}
}
