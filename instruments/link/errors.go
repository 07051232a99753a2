package link

import (
	"errors"
	"fmt"
	"io/fs"
	"syscall"
)

// The kinds of fault a link reports. Test for them with errors.Is.
var (
	// ErrTimeout means that the instrument did not answer, or did not take
	// what was sent, in the time allowed. Its answer may still come.
	ErrTimeout = errors.New("no answer in time")
	// ErrClosed means that Close was called on this side.
	ErrClosed = errors.New("link closed")
	// ErrLost means that the stream has ended: cable out, power off, or the
	// other side hung up. Only Reopen can help.
	ErrLost = errors.New("link lost")
	// ErrBusy means that another program holds the device.
	ErrBusy = errors.New("in use by another program")
	// ErrDenied means that this user may not open the device.
	ErrDenied = errors.New("permission denied")
	// ErrMissing means that there is no such device at the moment.
	ErrMissing = errors.New("no such device")
	// ErrTooLong means that a reply passed the limit without an end.
	ErrTooLong = errors.New("reply longer than allowed")
	// ErrBabble means that the instrument would not fall quiet while its
	// late replies were being thrown away.
	ErrBabble = errors.New("instrument keeps talking")
	// ErrUnsupported means an address of a kind that cannot be opened.
	ErrUnsupported = errors.New("not supported yet")
)

// Error says which operation failed on which address, why, and what a person
// might try.
type Error struct {
	Op      string // open, send, read, clear, reopen, close
	Address string // as the bench file spells it
	Hint    string // for a person; never matched on; may be empty
	Err     error
}

// Error reads like a path from outside in, the hint last.
func (e *Error) Error() string {
	if e.Hint == "" {
		return fmt.Sprintf("%s %s: %v", e.Op, e.Address, e.Err)
	}
	return fmt.Sprintf("%s %s: %v (%s)", e.Op, e.Address, e.Err, e.Hint)
}

// Unwrap gives the cause.
func (e *Error) Unwrap() error { return e.Err }

// hints are the first things a technician would try, by kind of fault.
var hints = []struct {
	kind error
	hint string
}{
	{ErrBusy, "close the other program that is connected to it; a second bench, perhaps"},
	{ErrLost, "check cable and power"},
}

// hintFor gives the hint of the first kind that matches err.
func hintFor(err error) string {
	for _, h := range hints {
		if errors.Is(err, h.kind) {
			return h.hint
		}
	}
	return ""
}

// openKinds maps what the system says on opening to our kinds.
var openKinds = []struct {
	is   error
	kind error
}{
	{fs.ErrPermission, ErrDenied},
	{fs.ErrNotExist, ErrMissing},
	{syscall.ENODEV, ErrMissing},
	{syscall.ENXIO, ErrMissing},
	{syscall.EBUSY, ErrBusy},
	{syscall.EWOULDBLOCK, ErrBusy},
}

// openKind adds our kind to an error of opening, keeping the cause.
func openKind(err error) error {
	for _, k := range openKinds {
		if errors.Is(err, k.is) {
			return fmt.Errorf("%w: %w", k.kind, err)
		}
	}
	return err
}

// lost adds ErrLost to whatever ended the stream, keeping the cause.
func lost(cause error) error {
	if cause == nil || errors.Is(cause, ErrLost) {
		return cause
	}
	return fmt.Errorf("%w: %w", ErrLost, cause)
}
