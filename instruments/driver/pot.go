package driver

import (
	"context"
	"fmt"
	"math"
	"strconv"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// PotOptions are what a pot is told.
type PotOptions struct {
	Options
	Codes int // how many codes the bench file says it has
}

// Pot is a digital potentiometer behind a bridge.
type Pot struct {
	instrument
	codes   int
	powered float64 // power-on count when last looked at; 0 where it can't tell
}

var _ instruments.Pot = (*Pot)(nil)

// OpenPot makes the driver and holds the bench file's count of codes against the part's own.
func OpenPot(ctx context.Context, conn *scpi.Conn, d *dialect.Dialect, o PotOptions) (*Pot, []string, error) {
	p := &Pot{instrument: newInstrument(conn, d, o.Options), codes: o.Codes}
	notes, err := p.open(ctx)
	if err != nil {
		return nil, notes, err
	}
	if err := p.count(ctx); err != nil {
		return nil, notes, err
	}
	if p.powered, err = p.powerOns(ctx); err != nil {
		return nil, notes, err
	}
	return p, notes, nil
}

// count refuses a bench file that has another number of codes than the part.
func (p *Pot) count(ctx context.Context) error {
	if !p.has("highest_code") {
		return nil
	}
	l, err := p.line("highest_code")
	if err != nil {
		return err
	}
	highest, err := p.measured(ctx, l, p.put(0))
	if err != nil {
		return err
	}
	if int(highest)+1 != p.codes {
		return &Error{Instrument: p.name, Command: l.Ask, Err: ErrWrong, Found: strconv.Itoa(int(highest)),
			Try: fmt.Sprintf("the part has %d codes, the bench file says codes = %d; correct it there", int(highest)+1, p.codes)}
	}
	return nil
}

// powerOns is the power-on count, or 0 where the bridge has none.
func (p *Pot) powerOns(ctx context.Context) (float64, error) {
	if !p.has("power_on_count") {
		return 0, nil
	}
	l, err := p.line("power_on_count")
	if err != nil {
		return 0, err
	}
	return p.measured(ctx, l, p.put(0))
}

// SetCode writes a code, reads it back from the part, and fails when they
// differ. A bridge that was powered on anew since the last look is an
// ErrRestarted, once: what was measured since is in doubt.
func (p *Pot) SetCode(ctx context.Context, code int) error {
	if code < 0 || code >= p.codes {
		return &Error{Instrument: p.name, Command: fmt.Sprintf("code %d", code), Err: ErrLimit,
			Try: fmt.Sprintf("codes run from 0 to %d", p.codes-1)}
	}
	if _, err := p.set(ctx, "code", p.put(float64(code)), si.One); err != nil {
		return err
	}
	return p.unbroken(ctx)
}

// Code is the code read back from the part.
func (p *Pot) Code(ctx context.Context) (int, error) {
	l, err := p.line("code")
	if err != nil {
		return 0, err
	}
	v, err := p.measured(ctx, l, p.put(0))
	if err != nil {
		return 0, err
	}
	if v != math.Trunc(v) || v < 0 || int(v) >= p.codes {
		return 0, &Error{Instrument: p.name, Command: l.Ask, Found: dialect.Number(v), Err: ErrReply,
			Try: fmt.Sprintf("a code from 0 to %d was expected; does the bridge reach the part?", p.codes-1)}
	}
	return int(v), p.unbroken(ctx)
}

// unbroken fails once when the power-on count has moved.
func (p *Pot) unbroken(ctx context.Context) error {
	now, err := p.powerOns(ctx)
	if err != nil {
		return err
	}
	before := p.powered
	p.powered = now
	if now == before {
		return nil
	}
	return &Error{Instrument: p.name, Command: p.d.Commands["power_on_count"].Ask, Err: ErrRestarted,
		Found: fmt.Sprintf("%g power-ons, %g before", now, before),
		Try:   "its wiper went to the middle meanwhile; measure the last point again, and look for a brown-out"}
}
