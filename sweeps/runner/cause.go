package runner

import (
	"context"
	"errors"
	"fmt"
	"runtime/debug"
	"sync"
	"time"

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

var (
	// errDone is the cause of a run that measured all it was asked to.
	errDone = errors.New("all setpoints measured")
	// errHold interrupts a visit: a person asked for a hold. It never ends a run.
	errHold = errors.New("held")
)

func (s *Stop) Error() string { return s.Reason }
func (t *Trip) Error() string { return t.Reason }
func (p *panicked) Error() string {
	return fmt.Sprintf("internal fault in the %s: %v", p.where, p.value)
}
func (j *journalFailed) Error() string { return "the journal can't be written: " + j.err.Error() }
func (j *journalFailed) Unwrap() error { return j.err }

// blind is the trip of a run that no longer sees what it drives.
func blind(age time.Duration) *Trip {
	return &Trip{Reason: fmt.Sprintf("blind: no good supply state for %.1f s while energised", age.Seconds())}
}

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

// withRaw adds the raw reading that a trip goes by.
func withRaw(reason string, cause error) string {
	var trip *Trip
	if errors.As(cause, &trip) && trip.Raw != "" {
		return fmt.Sprintf("%s (as received: %q)", reason, trip.Raw)
	}
	return reason
}

// meaning is the cause that the conductor's error stands for. A supply that
// fails to answer for as long as a blind run may last is a blind run.
func (r *Runner) meaning(err error) error {
	switch err := err.(type) {
	case *Stop, *Trip, *panicked, *journalFailed:
		return err
	}
	if age := r.supplyAge(); !errors.Is(err, errDone) && r.energised() == sweeps.EnergisedYes && age >= blindAfter {
		t := blind(age)
		t.Reason += ": " + err.Error()
		return t
	}
	return err
}

// secondThought asks the supply, once the bench is safe, whether its own
// protection was behind a failure: a latch stays until a person clears it.
func (r *Runner) secondThought(last context.Context, end Outcome) Outcome {
	if end.State != sweeps.Failed {
		return end
	}
	ctx, cancel := context.WithTimeout(last, 2*time.Second)
	defer cancel()
	err := guard("second thought", func() error {
		s, err := r.o.Bench.Supply.State(ctx)
		if err == nil && s.Tripped {
			end = Outcome{State: sweeps.Tripped, Reason: latched + "; noticed by: " + end.Reason}
		}
		return err
	})
	if err != nil {
		r.o.Log.Warn("the supply could not be asked about its protection", "err", err)
	}
	return end
}

// logPanic keeps the stack of an internal fault.
func (r *Runner) logPanic(cause error) {
	var p *panicked
	if errors.As(cause, &p) {
		r.o.Log.Error(p.Error(), "run", r.o.Run.ID, "stack", string(p.stack))
	}
}

// crew is the run's goroutines: none is started bare, a panic in any becomes
// the cause that ends the run, and all are waited for.
type crew struct {
	wg     sync.WaitGroup
	cancel context.CancelCauseFunc
}

// Go starts f.
func (c *crew) Go(where string, f func()) {
	c.wg.Go(func() {
		if err := guard(where, func() error { f(); return nil }); err != nil {
			c.cancel(err)
		}
	})
}

// wait returns when all have ended, or nobody will wait any longer.
func (c *crew) wait(last context.Context) {
	done := make(chan struct{})
	go func() { defer close(done); c.wg.Wait() }()
	select {
	case <-done:
	case <-last.Done():
	}
}

// guard runs f and turns a panic into an error.
func guard(where string, f func() error) (err error) {
	defer func() {
		if v := recover(); v != nil {
			err = &panicked{where: where, value: v, stack: debug.Stack()}
		}
	}()
	return f()
}
