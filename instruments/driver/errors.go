package driver

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// The kinds of fault a driver adds to those of link and scpi. Test for them
// with errors.Is.
var (
	// ErrRefused means that a setting did not take effect as asked.
	ErrRefused = errors.New("setting not taken")
	// ErrReply means that a reply was in form and yet of no use.
	ErrReply = errors.New("reply of no use")
	// ErrComplained means that the instrument queued errors.
	ErrComplained = errors.New("the instrument reported errors")
	// ErrLimit means that a setting was not sent, being above a limit of the bench.
	ErrLimit = errors.New("above the bench's limit")
	// ErrTripped means that a protection of the instrument holds its output off.
	ErrTripped = errors.New("a protection has tripped")
	// ErrNotConfigured means that a reading was asked before the settings were made.
	ErrNotConfigured = errors.New("not configured yet")
	// ErrSettingsLost means that the instrument no longer has the settings it was given.
	ErrSettingsLost = errors.New("settings lost")
	// ErrRestarted means that the pot was powered on anew, so its wiper moved by itself.
	ErrRestarted = errors.New("powered on anew")
	// ErrWrong means that another instrument answers than the one expected.
	ErrWrong = errors.New("wrong instrument")
)

// Error says which instrument failed at which command, what was found and
// what a person might try.
type Error struct {
	Instrument string // "meter average"
	Command    string // as sent
	Found      string // the reply, or the error queue; may be empty
	Try        string // for a person; never matched on; may be empty
	Err        error
}

// Error reads from outside in, what to try last.
func (e *Error) Error() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s: %v", e.Instrument, e.Command, e.Err)
	if e.Found != "" {
		fmt.Fprintf(&b, ": found %s", e.Found)
	}
	if e.Try != "" {
		fmt.Fprintf(&b, "; %s", e.Try)
	}
	return b.String()
}

// Unwrap gives the cause.
func (e *Error) Unwrap() error { return e.Err }

// fault names the instrument beside a cause from below, and notes what has to
// be mended first. The link's own hints are in the cause.
func (i *instrument) fault(command string, err error) error {
	var e *Error
	if errors.As(err, &e) {
		return err
	}
	i.shaken.Store(true)
	if errors.Is(err, link.ErrLost) {
		i.lost.Store(true)
	}
	try := ""
	if errors.Is(err, link.ErrTimeout) {
		try = "is it on, in remote mode, and is its dialect the right one?"
	}
	return &Error{Instrument: i.name, Command: command, Try: try, Err: cause(err)}
}

// cause leaves out what names the message a second time.
func cause(err error) error {
	var e *scpi.Error
	if errors.As(err, &e) {
		return fmt.Errorf("%s: %w", e.Address, e.Err)
	}
	return err
}

// refused says that a setting reads back otherwise, with what the instrument
// says about it.
func (i *instrument) refused(ctx context.Context, command, found string) *Error {
	e := &Error{Instrument: i.name, Command: command, Err: ErrRefused,
		Found: found + " when read back", Try: "is it within the instrument's range, and its panel unlocked?"}
	if faults, err := i.errors(ctx); err == nil && len(faults) > 0 {
		e.Found += ", and in its error queue " + list(faults)
	}
	return e
}

// explain adds to a time-out of a setting what the instrument says about it:
// a header it does not know has no reply, and an error in the queue instead.
func (i *instrument) explain(ctx context.Context, err error) error {
	var e *Error
	if !errors.Is(err, link.ErrTimeout) || ctx.Err() != nil || !errors.As(err, &e) || e.Found != "" {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, 2*i.base())
	defer cancel()
	if faults, asked := i.errors(ctx); asked == nil && len(faults) > 0 {
		e.Found = "in its error queue " + list(faults)
	}
	return err
}

func list(faults []scpi.Fault) string {
	words := make([]string, len(faults))
	for n, f := range faults {
		words[n] = f.Error()
	}
	return strings.Join(words, "; ")
}
