package runner

import (
	"context"
	"errors"
	"time"

	"nightbench/instruments"
)

// feedEvery is how often a cutoff that does not say how often is fed, wall time.
const feedEvery = 500 * time.Millisecond

// keepClosed keeps the cutoff's contact closed for as long as the run energises the
// board. A feeding that fails is tried once more at once; then the contact is about
// to open, and the run ends.
func (r *Runner) keepClosed(ctx context.Context) {
	every := feedEvery
	if f, ok := r.o.Bench.Cutoff.(interface{ Every() time.Duration }); ok {
		every = f.Every()
	}
	for {
		if r.feeding() {
			if err := r.keepFed(ctx); err != nil {
				r.cancel(&Trip{Reason: "the cutoff can't be fed: " + err.Error()})
				return
			}
		}
		if r.o.Clock.Wait(ctx, every) != nil {
			return
		}
	}
}

// keepFed feeds once. A feeding that crossed with the making safe may have closed
// the contact again behind it: then it is opened once more.
func (r *Runner) keepFed(ctx context.Context) error {
	err := r.feedCutoff(ctx)
	if err != nil && ctx.Err() == nil {
		err = r.feedCutoff(ctx)
	}
	if !r.feeding() {
		ctx, cancel := context.WithTimeout(context.WithoutCancel(ctx), safeAttempt)
		defer cancel()
		if open := r.o.Bench.Cutoff.Open(ctx); !errors.Is(open, instruments.ErrAbsent) {
			err = open
		}
	}
	if ctx.Err() != nil {
		return nil
	}
	return err
}

func (r *Runner) feeding() bool {
	r.mu.Lock()
	defer r.mu.Unlock()
	return r.fed && r.o.Bench.Cutoff != nil
}

// setFeeding says whether the contact is to be kept closed: from energising until the making safe begins.
func (r *Runner) setFeeding(on bool) {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.fed = on
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
