package runner

import (
	"context"
	"errors"
	"fmt"
	"runtime/debug"
	"sync"

	"nightbench/sweeps"
)

// The causes that end a run. Each is an error so that it can travel as the
// cause of a cancelled context.
type (
	// Stop is a person's or a plan's wish to end: not a fault.
	Stop struct{ Reason string }
	// Trip is a limit passed, with the raw reading.
	Trip struct{ Reason, Raw string }
	// panicked is a bug that surfaced in one of the run's goroutines.
	panicked struct {
		where string
		value any
		stack []byte
	}
	journalFailed struct{ err error }
)

// errDone is the cause of a run that measured all it was asked to.
var errDone = errors.New("all setpoints measured")

func (s *Stop) Error() string { return s.Reason }
func (t *Trip) Error() string { return t.Reason }
func (p *panicked) Error() string {
	return fmt.Sprintf("internal fault in the %s: %v", p.where, p.value)
}
func (j *journalFailed) Error() string { return "the journal can't be written: " + j.err.Error() }
func (j *journalFailed) Unwrap() error { return j.err }

// ending maps the cause to how the run ends.
func ending(cause error) Outcome {
	var stop *Stop
	var trip *Trip
	switch {
	case cause == nil || errors.Is(cause, errDone):
		return Outcome{State: sweeps.Done, Reason: errDone.Error()}
	case errors.As(cause, &trip):
		return Outcome{State: sweeps.Tripped, Reason: trip.Reason}
	case errors.As(cause, &stop):
		return Outcome{State: sweeps.Stopped, Reason: stop.Reason}
	case errors.Is(cause, context.Canceled):
		return Outcome{State: sweeps.Stopped, Reason: "the daemon was told to end"}
	}
	return Outcome{State: sweeps.Failed, Reason: cause.Error()}
}

// crew is the run's goroutines: none is started bare, a panic in any becomes
// the cause that ends the run, and all are waited for.
type crew struct {
	wg     sync.WaitGroup
	cancel context.CancelCauseFunc
}

// Go starts f.
func (c *crew) Go(where string, f func()) {
	c.wg.Add(1)
	go func() {
		defer c.wg.Done()
		if err := c.guard(where, func() error { f(); return nil }); err != nil {
			c.cancel(err)
		}
	}()
}

// guard runs f and turns a panic into an error.
func (c *crew) guard(where string, f func() error) (err error) {
	defer func() {
		if v := recover(); v != nil {
			err = &panicked{where: where, value: v, stack: debug.Stack()}
		}
	}()
	return f()
}
