// Package driver keeps the promises of the roles: it speaks SCPI messages over
// a connection, in the words of a dialect. It holds no knowledge of any maker.
//
// Every setter reads back what took effect and fails when it differs. A reply
// is a number only when it is one: overload and "no value" are outcomes. After
// a connection was out of step the settings are read back before they are
// relied on, since the instrument may have been switched off and on meanwhile.
//
// Off, State and Identify may be called from any goroutine at any time; what
// makes or uses settings (Configure, Read, Capture, SetCode) from one at a time.
package driver

import (
	"context"
	"errors"
	"fmt"
	"sync/atomic"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
)

// Options are what every driver is told.
type Options struct {
	Name    string // for messages: "supply", "meter average"
	Channel int    // 0 means 1
	Clock   instruments.Clock
}

// instrument is what all roles share: a connection and the words for it.
type instrument struct {
	name    string
	channel int
	clock   instruments.Clock
	conn    *scpi.Conn
	d       *dialect.Dialect
	*health
}

// health is what a failed exchange leaves behind.
type health struct {
	lost   atomic.Bool // the link is gone and has to be opened anew
	shaken atomic.Bool // settings have to be read back before they are relied on
	greet  atomic.Bool // the opening lines have to be sent again
}

func newInstrument(conn *scpi.Conn, d *dialect.Dialect, o Options) instrument {
	i := instrument{name: o.Name, channel: max(o.Channel, 1), clock: o.Clock, d: d, health: &health{}}
	i.conn = conn.Within(i.base())
	return i
}

// Settings gives the scpi options that a dialect asks for. Only a query whose
// reply is known beforehand can prove that a connection is in step.
func Settings(d *dialect.Dialect) scpi.Options {
	o := scpi.Options{ErrorQuery: d.Errors.Ask, ErrorDepth: d.Errors.Depth, ResyncLimit: resyncLimit,
		Gap: d.Link.Gap, Echo: d.Link.Echo}
	if c := d.Completion; c == nil || c.Style == "dwell" {
		o.NoMarker = true
	} else {
		o.Marker = scpi.Marker{Query: c.Ask, Replies: c.Until}
	}
	if l, ok := d.Commands["identify"]; ok {
		o.IdentityQuery = l.Ask
	}
	return o
}

// resyncLimit bounds the regaining of step: an instrument that has not come
// back by then is treated as lost.
const resyncLimit = 10 * time.Second

// Identify asks who answers.
func (i *instrument) Identify(ctx context.Context) (instruments.Identity, error) {
	l, err := i.line("identify")
	if err != nil {
		return instruments.Identity{}, err
	}
	if err := i.mend(ctx); err != nil {
		return instruments.Identity{}, err
	}
	reply, err := i.conn.Query(ctx, l.Ask)
	if err != nil {
		return instruments.Identity{}, i.fault(l.Ask, err)
	}
	return scpi.ParseIdentity(reply), nil
}

// open sends the opening lines, since some instruments obey nothing before
// them, and drains the error queue, which belongs to whoever was there before.
// What it held is returned in words.
func (i *instrument) open(ctx context.Context) (notes []string, err error) {
	if err := i.sequence(ctx, i.d.Open); err != nil {
		return nil, err
	}
	old, err := i.errors(ctx)
	for _, f := range old {
		notes = append(notes, fmt.Sprintf("its error queue held %v when it was opened", f))
	}
	return notes, err
}

// sequence sends lines of opening or closing, all of them, whatever happens to one.
func (i *instrument) sequence(ctx context.Context, lines []dialect.Line) error {
	var errs []error
	for _, l := range lines {
		errs = append(errs, i.utter(ctx, l, i.put(0)))
	}
	return errors.Join(errs...)
}

// reset brings an instrument that feeds nothing to a known state.
func (i *instrument) reset(ctx context.Context) error {
	for _, name := range []string{"reset", "clear_status"} {
		l, ok := i.d.Commands[name]
		if !ok {
			continue
		}
		if err := i.say(ctx, l, i.put(0)); err != nil {
			return err
		}
		if err := i.within(resetTime).done(ctx); err != nil {
			return err
		}
	}
	for _, l := range i.d.Setup {
		if err := i.say(ctx, l, i.put(0)); err != nil {
			return err
		}
	}
	return nil
}

// resetTime is allowed for *RST: relays settle and memories are cleared
// (common practice, no source).
const resetTime = 8 * time.Second

// Close sends the closing lines of the dialect, all of them, whatever happens to one.
func (i *instrument) Close(ctx context.Context) error { return i.sequence(ctx, i.d.Close) }

// line finds a line of the dialect, or says what the instrument can't do.
func (i *instrument) line(name string) (dialect.Line, error) {
	l, err := i.d.Line(name)
	if err != nil {
		return l, fmt.Errorf("%s: %w", i.name, err)
	}
	return l, nil
}

func (i *instrument) has(name string) bool { _, ok := i.d.Commands[name]; return ok }

// put is a value on the instrument's own channel.
func (i *instrument) put(v float64) dialect.Put { return i.d.Put(v, i.channel) }

// within is the same instrument with a longer time-out. The time is added to
// the time of a reply, so that a fast clock never makes it shorter than a link needs.
func (i *instrument) within(more time.Duration) *instrument {
	slow := *i
	slow.conn = i.conn.Within(i.base() + more)
	return &slow
}

// base is the time allowed for a plain reply.
func (i *instrument) base() time.Duration {
	if i.d.Link.Timeout > 0 {
		return i.d.Link.Timeout
	}
	return defaultTimeout
}

// defaultTimeout is for dialects that state none; instruments are known that
// take 0.4 s for a state query.
const defaultTimeout = 3 * time.Second

// bench is the wall time that s seconds of bench time take.
func (i *instrument) bench(s float64) time.Duration {
	return time.Duration(s / i.clock.Pace() * float64(time.Second))
}
