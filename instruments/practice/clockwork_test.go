package practice

import (
	"context"
	"sync"
	"time"

	"nightbench/instruments"
)

// clockwork is a clock that waiting moves on at once.
type clockwork struct {
	mu sync.Mutex
	t  time.Duration
}

var _ instruments.Clock = (*clockwork)(nil)

func (c *clockwork) Elapsed() time.Duration {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.t
}

func (c *clockwork) Sleep(ctx context.Context, d time.Duration) error {
	if ctx.Err() != nil {
		return context.Cause(ctx)
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.t += max(d, 0)
	return nil
}

func (c *clockwork) Wait(ctx context.Context, d time.Duration) error { return c.Sleep(ctx, d) }
func (c *clockwork) Now() time.Time                                  { return time.Unix(0, 0).Add(c.Elapsed()) }
func (c *clockwork) Pace() float64                                   { return 1 }
