package driver

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"nightbench/instruments/dialect"
	"nightbench/instruments/scpi"
)

// done waits until all operations have ended, in the dialect's way. A dialect
// without one leaves it to the next query to wait.
func (i *instrument) done(ctx context.Context) error {
	c := i.d.Completion
	switch {
	case c == nil:
		return nil
	case c.Style == "dwell":
		return i.clock.Wait(ctx, c.Dwell)
	}
	for {
		reply, err := i.conn.Query(ctx, c.Ask)
		switch {
		case err != nil:
			return err
		case slices.Contains(c.Until, strings.TrimSpace(reply)):
			return nil
		case c.Style == "held":
			return fmt.Errorf("%w: %s answered %q instead of %q", ErrReply, c.Ask, reply, c.Until[0])
		}
		if err := i.clock.Wait(ctx, pollEvery); err != nil {
			return err
		}
	}
}

// errors reads what the instrument complains of, until there is no more.
func (i *instrument) errors(ctx context.Context) ([]scpi.Fault, error) {
	if i.d.Errors.Form == "none" {
		return nil, nil
	}
	if err := i.mend(ctx); err != nil {
		return nil, err
	}
	faults, err := i.drain(ctx)
	if err != nil {
		return faults, i.fault(i.d.Errors.Ask, err)
	}
	return faults, nil
}

// drain reads at most one more than can be there.
func (i *instrument) drain(ctx context.Context) (faults []scpi.Fault, err error) {
	e := i.d.Errors
	if err := i.latch(ctx); err != nil {
		return nil, err
	}
	for range e.Depth + 1 {
		reply, err := i.conn.Query(ctx, e.Ask)
		if err != nil {
			return faults, err
		}
		f, more := parseFault(e, reply)
		switch {
		case !more:
			return faults, nil
		case e.Again != 0 && f.Code == e.Again:
			err = i.latch(ctx)
		default:
			faults = append(faults, f)
		}
		if err != nil {
			return faults, err
		}
	}
	return faults, fmt.Errorf("%w: still not empty after %d", scpi.ErrQueue, e.Depth+1)
}

// latch reads the event status register, which makes the events before it readable (form events).
func (i *instrument) latch(ctx context.Context) error {
	if i.d.Errors.Form != "events" {
		return nil
	}
	_, err := i.conn.Query(ctx, i.d.Errors.Status)
	return err
}

// parseFault reads one reply; more is false where it says that there is no error.
func parseFault(e dialect.ErrorQueue, reply string) (f scpi.Fault, more bool) {
	text := strings.TrimSpace(reply)
	if slices.ContainsFunc(e.None, func(none string) bool { return strings.EqualFold(none, text) }) {
		return f, false
	}
	if e.Form == "text" {
		return scpi.Fault{Text: text}, true
	}
	f, more = scpi.ParseFault(text)
	if e.Sign == "positive" && f.Code >= 100 && f.Code < 500 {
		f.Code = -f.Code // the standard's classes, printed without their sign
	}
	return f, more
}

// clean fails when the instrument has complained since it was last asked.
func (i *instrument) clean(ctx context.Context, after string) error {
	faults, err := i.errors(ctx)
	if err != nil || len(faults) == 0 {
		return err
	}
	return &Error{Instrument: i.name, Command: after, Found: list(faults), Err: ErrComplained,
		Try: "is the right dialect named for it? nightbench ask shows what it accepts"}
}
