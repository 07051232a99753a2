package runner

import (
	"context"
	"fmt"

	"nightbench/sweeps"
)

// heldUp waits while a person holds the run: output off and confirmed, then, when
// asked to continue, on again at the setpoint next, which is reached from the same side.
func (r *Runner) heldUp(ctx context.Context, next sweeps.Setpoint) error {
	select {
	case <-r.hold:
	default:
		return nil
	}
	select { // a continue from before this hold means nothing
	case <-r.goOn:
	default:
	}
	off := r.switchOff(ctx)
	if err := context.Cause(ctx); err != nil {
		return err
	}
	if !off.Confirmed {
		return fmt.Errorf("hold: off is not confirmed: %s", off.Words)
	}
	r.setState(sweeps.HeldState)
	r.doing("Held", "Output off; continue goes on at "+Place(next)+".")
	select {
	case <-r.goOn:
	case <-ctx.Done():
		return context.Cause(ctx)
	}
	if err := r.prepare(ctx, next); err != nil {
		return err
	}
	return r.energise(ctx, next)
}
