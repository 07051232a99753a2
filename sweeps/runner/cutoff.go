package runner

import (
	"context"
	"errors"
	"time"

	"nightbench/instruments"
)

// feedEvery is how often a cutoff that does not say how often is fed, wall time.
const feedEvery = 500 * time.Millisecond

// keepClosed keeps the cutoff's contact closed for as long as the run lasts. A feeding that
// fails is tried once more at once; then the contact is about to open, and the run ends.
func (r *Runner) keepClosed(ctx context.Context) {
	every := feedEvery
	if f, ok := r.o.Bench.Cutoff.(interface{ Every() time.Duration }); ok {
		every = f.Every()
	}
	for {
		err := r.feedCutoff(ctx)
		if err != nil && ctx.Err() == nil {
			err = r.feedCutoff(ctx)
		}
		if err != nil && ctx.Err() == nil {
			r.cancel(&Trip{Reason: "the cutoff can't be fed: " + err.Error()})
			return
		}
		if r.o.Clock.Wait(ctx, every) != nil {
			return
		}
	}
}

// feedCutoff closes the contact or keeps it closed; on a bench without a cutoff it does nothing.
func (r *Runner) feedCutoff(ctx context.Context) error {
	if r.o.Bench.Cutoff == nil {
		return nil
	}
	if err := r.o.Bench.Cutoff.Feed(ctx); !errors.Is(err, instruments.ErrAbsent) {
		return err
	}
	return nil
}
