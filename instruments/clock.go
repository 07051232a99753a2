package instruments

import (
	"context"
	"time"
)

// Clock is the one source of time. Bench time runs Pace times as fast as the
// wall: settling, apertures, warm-up and a plan's limits are bench time; links,
// blind time-outs and the stamps of records are wall time. On a real bench Pace is 1.
type Clock interface {
	Now() time.Time                                   // wall time, UTC, with the monotonic reading
	Elapsed() time.Duration                           // bench time since the clock was made, monotonic
	Sleep(ctx context.Context, d time.Duration) error // d of bench time; returns the cause when ctx ends first
	Wait(ctx context.Context, d time.Duration) error  // d of wall time; likewise
	Pace() float64
}

// NewClock starts a clock whose bench time runs pace times as fast as the wall.
func NewClock(pace float64) Clock { return &wall{start: time.Now(), pace: pace} }

type wall struct {
	start time.Time
	pace  float64
}

// Now keeps the monotonic reading, which UTC() would keep too.
func (w *wall) Now() time.Time { return time.Now().UTC() }

func (w *wall) Elapsed() time.Duration {
	return time.Duration(float64(time.Since(w.start)) * w.pace)
}

func (w *wall) Pace() float64 { return w.pace }

func (w *wall) Sleep(ctx context.Context, d time.Duration) error {
	return w.Wait(ctx, time.Duration(float64(d)/w.pace))
}

func (w *wall) Wait(ctx context.Context, d time.Duration) error {
	if ctx.Err() != nil {
		return context.Cause(ctx)
	}
	if d <= 0 {
		return nil
	}
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-t.C:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	}
}
