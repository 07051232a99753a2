package scpi

import (
	"context"
	"fmt"
	"strconv"
	"strings"
)

// Fault is one entry of an instrument's error queue: what a client reads, and
// what the handler of a simulated instrument returns to queue one. Codes are
// negative for the standard's errors, positive for the maker's. Code 0 with a
// text is an entry whose number could not be read.
type Fault struct {
	Code int
	Text string // as the queue answers it, without the quotes
}

// Error is the fault as the queue answers it.
func (f Fault) Error() string { return fmt.Sprintf("%d,%s", f.Code, FormatString(f.Text)) }

// Overflow says that errors after this one are unknown: the queue was full.
func (f Fault) Overflow() bool { return f.Code == QueueOverflow }

// ParseFault reads one reply of an error queue, such as
//
//	-222,"Data out of range;VOLT 99"
//	+0,"No error"
//	0 No Error
//
// ok is false when the queue was empty. A text without a number counts as a
// fault of code 0.
func ParseFault(reply string) (f Fault, ok bool) {
	body := strings.TrimSpace(reply)
	end := skipDigits(body, skipAny(body, 0, 1, "+-"))
	code, err := strconv.Atoi(body[:end])
	rest := strings.TrimLeft(body[end:], " ")
	if err != nil || rest == body[end:] && rest != "" && rest[0] != ',' {
		return Fault{Text: body}, true
	}
	text := strings.TrimSpace(strings.TrimPrefix(rest, ","))
	if inner, err := ParseString(text); err == nil {
		text = inner
	}
	return Fault{Code: code, Text: text}, code != 0
}

// Errors reads the error queue until it is empty, oldest first. It reads at
// most one more than the queue can hold; a queue that is not empty then is an
// ErrQueue beside what was read. If one of the faults is an Overflow, there
// were more that nobody knows.
func (c *Conn) Errors(ctx context.Context) (faults []Fault, err error) {
	for range c.opt.ErrorDepth + 1 {
		reply, err := c.Query(ctx, c.opt.ErrorQuery)
		if err != nil {
			return faults, err
		}
		f, ok := ParseFault(reply)
		if !ok {
			return faults, nil
		}
		faults = append(faults, f)
	}
	return faults, c.wrap(c.opt.ErrorQuery, fmt.Errorf("%w: still %v after %d", ErrQueue, faults[len(faults)-1], len(faults)))
}
