package driver

import (
	"context"
	"fmt"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// holdFor is how long the contact stays closed without being fed. It has to be longer
// than the longest pause of a busy computer, and short against what a locked motor bears.
const holdFor = 3 * time.Second

// Cutoff is a relay in the supply lead that opens unless it is fed.
type Cutoff struct {
	instrument
	hold time.Duration
}

var _ instruments.Cutoff = (*Cutoff)(nil)

// OpenCutoff makes the driver, sets how long the contact holds where the relay can
// be told, and leaves the contact as it is.
func OpenCutoff(ctx context.Context, conn *scpi.Conn, d *dialect.Dialect, o Options) (*Cutoff, []string, error) {
	c := &Cutoff{instrument: newInstrument(conn, d, o), hold: holdFor}
	notes, err := c.open(ctx)
	if err != nil {
		return nil, notes, err
	}
	if c.has("time") {
		if _, err := c.set(ctx, "time", c.put(holdFor.Seconds()), si.Second); err != nil {
			return nil, notes, err
		}
	}
	closed, err := c.flag(ctx, "closed")
	if err == nil && closed {
		notes = append(notes, "its contact was closed when it was opened; it opens unless a run feeds it")
	}
	return c, notes, err
}

// Every is how often it wants to be fed: one late or lost feeding does not open it.
func (c *Cutoff) Every() time.Duration { return c.hold / 4 }

// Feed closes the contact, or keeps it closed, and reads it back.
func (c *Cutoff) Feed(ctx context.Context) error {
	if err := c.ensure(ctx, "feed", c.put(0)); err != nil {
		return err
	}
	return c.contact(ctx, "feed", true)
}

// Open opens the contact at once, without getting in step first, and reads it back.
func (c *Cutoff) Open(ctx context.Context) error {
	l, err := c.line("open")
	if err != nil {
		return err
	}
	if err := c.conn.Blind(ctx, c.put(0).Fill(l.Send)); err != nil {
		return c.fault(l.Send, err)
	}
	return c.contact(ctx, "open", false)
}

// contact fails when the contact is not as it was told to be.
func (c *Cutoff) contact(ctx context.Context, told string, want bool) error {
	closed, err := c.flag(ctx, "closed")
	if err != nil || closed == want {
		return err
	}
	words := map[bool]string{true: "closed", false: "open"}
	return &Error{Instrument: c.name, Command: c.d.Commands[told].Send, Err: ErrRefused, Found: fmt.Sprintf("the contact is %s", words[closed]),
		Try: "has it power of its own? A welded contact stays closed: replace the relay, and switch the supply off by hand"}
}
