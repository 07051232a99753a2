package runner

import (
	"context"
	"fmt"

	"nightbench/sweeps"
)

// holding tells whether a person has asked for a hold that is not met yet. It is
// asked after every reading: the reading in hand is finished, the point is not.
func (r *Runner) holding() bool { return len(r.hold) > 0 }

// heldUp switches off, confirmed, and waits until a person lets the run go on.
func (r *Runner) heldUp(ctx context.Context, next sweeps.Setpoint) error {
	off := r.switchOff(ctx)
	if err := context.Cause(ctx); err != nil {
		return err
	}
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindOff, Words: off.Words, Off: &off}); err != nil {
		return &journalFailed{err}
	}
	if !off.Confirmed {
		return fmt.Errorf("hold: off is not confirmed: %s", off.Words)
	}
	drain(r.goOn) // a continue from before this hold means nothing
	r.setState(sweeps.HeldState)
	drain(r.hold)
	r.doing("Held", "Output off; continue goes on at "+Place(next)+".")
	select {
	case <-r.goOn:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	}
}

func drain(c chan struct{}) {
	select {
	case <-c:
	default:
	}
}
