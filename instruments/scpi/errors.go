package scpi

import (
	"errors"
	"fmt"
	"strings"
)

// The kinds of fault of an exchange, beside those of the link. Test for them
// with errors.Is.
var (
	// ErrOutOfStep means that replies could not be proven to belong to their
	// questions, whatever was tried; nothing was asked.
	ErrOutOfStep = errors.New("out of step with the instrument")
	// ErrOther means that another instrument answers than the one remembered.
	ErrOther = errors.New("another instrument answers")
	// ErrFraming means that a reply had not the shape it must have: a block
	// with a wrong count, two lines instead of one.
	ErrFraming = errors.New("reply of the wrong shape")
	// ErrForm means that a reply was one line, but not a number, boolean or
	// string as expected.
	ErrForm = errors.New("reply of the wrong form")
	// ErrIndefinite means a block of indefinite length, which has no end on a
	// stream.
	ErrIndefinite = errors.New("block of indefinite length (#0), which has no end on a serial line or socket")
	// ErrInterrupted means that Blind sent something in the middle.
	ErrInterrupted = errors.New("interrupted by a command sent blind")
	// ErrMessage means that the text was refused before it was sent.
	ErrMessage = errors.New("not sent")
	// ErrQueue means that the error queue could not be read to its end.
	ErrQueue = errors.New("error queue never empty")
)

// Error says which message failed at which address, and why.
type Error struct {
	Message string
	Address string
	Err     error
}

// Error reads like a path from outside in.
func (e *Error) Error() string {
	return fmt.Sprintf("%q to %s: %v", e.Message, e.Address, e.Err)
}

// Unwrap gives the cause.
func (e *Error) Unwrap() error { return e.Err }

// checkMessage keeps to one command a message, at most one query a message:
// then a reply has one question it can belong to, and header paths of
// compound messages never matter.
func checkMessage(text string, query bool) error {
	bare := outsideQuotes(text)
	switch {
	case strings.TrimSpace(text) == "":
		return fmt.Errorf("%w: empty message", ErrMessage)
	case strings.ContainsAny(text, "\r\n\x00"):
		return fmt.Errorf("%w: %q holds a line end", ErrMessage, text)
	case strings.Contains(bare, ";"):
		return fmt.Errorf("%w: %q is more than one command; send them one at a time", ErrMessage, text)
	case query != strings.Contains(bare, "?"):
		return fmt.Errorf("%w: %q; Query is for what has a ? and Write for what has none", ErrMessage, text)
	}
	return nil
}

// outsideQuotes drops quoted strings from a message.
func outsideQuotes(text string) string {
	var b strings.Builder
	var quote rune
	for _, r := range text {
		switch {
		case quote != 0:
			if r == quote {
				quote = 0
			}
		case r == '"' || r == '\'':
			quote = r
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// clip shortens bytes for a message.
func clip(b []byte) []byte { return b[:min(len(b), 80)] }
