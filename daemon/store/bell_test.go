package store

import (
	"context"
	"errors"
	"path/filepath"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// TestWatchersMissNothing: watchers that read to the tail and wait for the bell
// see every entry once, in order, while two writers append.
func TestWatchersMissNothing(t *testing.T) {
	const writers, each, watchers = 2, 60, 5
	s := openStore(t)
	var wg sync.WaitGroup
	for range watchers {
		wg.Go(func() {
			for after := int64(0); after < writers*each; {
				if err := s.Wait(t.Context(), after); err != nil {
					t.Error(err)
					return
				}
				es, err := s.Entries(t.Context(), after, 7)
				if err != nil || len(es) == 0 {
					t.Errorf("woken for nothing after %d: %v", after, err)
					return
				}
				for _, e := range es {
					if e.Seq != after+1 {
						t.Errorf("entry %d follows %d", e.Seq, after)
					}
					after = e.Seq
				}
			}
		})
	}
	for range writers {
		wg.Go(func() {
			for range each {
				mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog, Words: "tick"})
			}
		})
	}
	wg.Wait()
}

func TestRingsOutOfOrder(t *testing.T) {
	b := newBell()
	b.ring(2)
	b.ring(1)
	if newer, _, _ := b.look(1); !newer {
		t.Error("a late ring took entry 2 back")
	}
}

// TestWaitSleepsUntilTheBell runs in a bubble over a real file: the watcher is
// at rest (no polling, or the hour would never pass in one step) until something is appended.
func TestWaitSleepsUntilTheBell(t *testing.T) {
	path := filepath.Join(t.TempDir(), "nightbench.db")
	synctest.Test(t, func(t *testing.T) {
		s, err := Open(t.Context(), path, instruments.NewClock(1))
		if err != nil {
			t.Fatal(err)
		}
		defer s.Close(context.Background())
		begin := time.Now()
		woken := make(chan time.Duration, 1)
		go func() {
			if err := s.Wait(t.Context(), 0); err != nil {
				t.Error(err)
			}
			woken <- time.Since(begin)
		}()
		time.Sleep(time.Hour)
		mustAppend(t, s, sweeps.Entry{Kind: sweeps.KindLog, Words: "midnight"})
		if d := <-woken; d != time.Hour {
			t.Errorf("woken after %v", d)
		}
	})
}

func TestWaitEnds(t *testing.T) {
	s := openStore(t)
	gone := errors.New("watcher gone")
	ctx, cancel := context.WithCancelCause(t.Context())
	ended, closed := make(chan error), make(chan error)
	go func() { ended <- s.Wait(ctx, 0) }()
	go func() { closed <- s.Wait(context.Background(), 0) }()
	cancel(gone)
	if err := <-ended; !errors.Is(err, gone) {
		t.Errorf("cancelled: %v", err)
	}
	s.Close(t.Context())
	if err := <-closed; !errors.Is(err, ErrClosed) {
		t.Errorf("closed: %v", err)
	}
}
