// Package conformance holds exchanges that any instrument which claims the message
// rules of IEEE 488.2 and the mandatory nodes of SCPI-1999 must carry on, each with the
// rule it checks. The practice instruments are held against all of it; a real bench can
// be asked the same with make bench-test, output off and nothing connected.
package conformance

import (
	"context"
	"errors"
	"fmt"
	"regexp"
	"strings"
)

// Exchange is what is said, what must come back, and the rule behind it. Messages and
// replies are separated by ⏎; a reply is a regular expression for the whole line, and
// a message that holds no question mark, or is marked with ~, has none.
type Exchange struct {
	Rule string
	Say  string
	Want string
	Code string // of the error queued at the end, a regular expression; empty: none
}

// Talker is a line to one instrument.
type Talker interface {
	Send(ctx context.Context, message string) error
	Ask(ctx context.Context, message string) (reply string, err error)
}

// Check carries one exchange on. The error says what was found and the rule that it breaks.
func Check(ctx context.Context, t Talker, e Exchange) error {
	if err := t.Send(ctx, "*CLS"); err != nil {
		return err
	}
	wants := strings.Split(e.Want, "⏎")
	if e.Want == "" {
		wants = nil
	}
	for message := range strings.SplitSeq(e.Say, "⏎") {
		bare, mute := strings.CutPrefix(message, "~")
		if mute || !strings.Contains(bare, "?") {
			if err := t.Send(ctx, bare); err != nil {
				return e.broken("%q: %v", bare, err)
			}
			continue
		}
		if len(wants) == 0 {
			return e.broken("the table expects no reply to %q", bare)
		}
		if err := e.reply(ctx, t, bare, wants[0]); err != nil {
			return err
		}
		wants = wants[1:]
	}
	return e.queued(ctx, t)
}

func (e Exchange) broken(format string, args ...any) error {
	return fmt.Errorf("%s: %q: %s", e.Rule, e.Say, fmt.Sprintf(format, args...))
}

// reply asks and holds the reply against what is wanted.
func (e Exchange) reply(ctx context.Context, t Talker, message, want string) error {
	got, err := t.Ask(ctx, message)
	if err != nil {
		return e.broken("%q: %v", message, err)
	}
	if ok, err := regexp.MatchString("^(?:"+want+")$", got); err != nil || !ok {
		return errors.Join(err, e.broken("%q answers %q, expected %s", message, got, want))
	}
	return nil
}

// queued holds the oldest error against the code expected. A reply that was not to come
// stands in front of it and is found here too.
func (e Exchange) queued(ctx context.Context, t Talker) error {
	got, err := t.Ask(ctx, "SYST:ERR?")
	if err != nil {
		return e.broken("the error queue: %v", err)
	}
	want := e.Code
	if want == "" {
		want = `[+]?0`
	}
	if ok, err := regexp.MatchString(`^(?:`+want+`),".*"$`, got); err != nil || !ok {
		return errors.Join(err, e.broken("the error queue holds %s, expected %s", got, want))
	}
	return t.Send(ctx, "*CLS")
}

// dangerous are messages that could energise a board, move an output, or let go of a latch.
var dangerous = regexp.MustCompile(`(?i)outp[a-z]*(:stat[a-z]*)?\s+(on|[1-9#])|\*tst\?|\*sav|\*rcl|prot[a-z]*:cle|\bfeed\b|\bcal[a-z]*:|\bsyst[a-z]*:sec`)

// Harmless tells whether an exchange may be sent to a real instrument: queries, settings
// at output off, mistakes; never output on, a self-test, a protection clear.
func (e Exchange) Harmless() bool { return !dangerous.MatchString(e.Say) }
