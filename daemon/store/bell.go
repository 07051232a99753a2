package store

import (
	"context"
	"sync"
)

// bell tells everyone who waits that the journal has grown. A waiter looks at
// last and takes the channel under the same lock that a ring changes both
// under, so no ring is missed; each waiter costs one channel reference.
type bell struct {
	mu    sync.Mutex
	last  int64         // seq of the newest entry; under mu
	next  chan struct{} // closed by the next ring; under mu
	ended bool          // under mu
}

func newBell() *bell { return &bell{next: make(chan struct{})} }

// ring announces that entries up to seq exist. Rings may come out of order.
func (b *bell) ring(seq int64) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if seq <= b.last || b.ended {
		return
	}
	b.last = seq
	close(b.next)
	b.next = make(chan struct{})
}

// close ends all waiting, now and later.
func (b *bell) close() {
	b.mu.Lock()
	defer b.mu.Unlock()
	if !b.ended {
		b.ended = true
		close(b.next)
	}
}

// look answers whether something newer than after exists, and if not, what to wait for.
func (b *bell) look(after int64) (newer, ended bool, next <-chan struct{}) {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.last > after, b.ended, b.next
}

// wait returns nil as soon as an entry with a seq above after exists,
// ErrClosed when the store closes first, and the context's cause when that ends first.
func (b *bell) wait(ctx context.Context, after int64) error {
	for {
		newer, ended, next := b.look(after)
		switch {
		case newer:
			return nil
		case ended:
			return ErrClosed
		}
		select {
		case <-next:
		case <-ctx.Done():
			return context.Cause(ctx)
		}
	}
}
