package link

import (
	"context"
	"errors"
	"io"
	"slices"
	"testing"
	"testing/synctest"
	"time"
)

func TestBlindGoesBetween(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{})
		c := <-far
		off := make(chan time.Duration, 1)
		start := time.Now()
		go func() {
			take(t, c, 3)
			if got := take(t, c, 4); got != "OFF\n" {
				t.Errorf("came %q, want OFF", got)
			}
			off <- time.Since(start)
		}()
		go l.Query(t.Context(), "A?") // never answered: holds the link for 5 s
		time.Sleep(time.Second)
		interjected, err := l.Blind(t.Context(), "OFF")
		if err != nil || !interjected {
			t.Errorf("interjected %v, %v; want true", interjected, err)
		}
		if d := <-off; d != time.Second {
			t.Errorf("off after %v, want 1 s", d)
		}
		l.Close()
	})
}

func TestBlindReopensAStuckStream(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{WriteTimeout: time.Second})
		<-far // takes nothing: a net.Pipe blocks the writer
		go l.Query(t.Context(), "A?")
		synctest.Wait()
		off := make(chan string, 1)
		go func() {
			c := <-far
			off <- take(t, c, 5)
			c.Close()
		}()
		start := time.Now()
		if _, err := l.Blind(t.Context(), "OFF"); err != nil {
			t.Error(err)
		}
		if got := <-off; got != "\nOFF\n" {
			t.Errorf("came %q, want a terminator and OFF", got)
		}
		if d := time.Since(start); d > 4*time.Second {
			t.Errorf("took %v", d)
		}
		l.Close()
	})
}

// sluice is a stream that takes a line only when it is let, and keeps it.
type sluice struct {
	let  chan struct{}
	sent chan string
}

func (g sluice) Read([]byte) (int, error) { return 0, nil }
func (g sluice) Write(p []byte) (int, error) {
	<-g.let
	g.sent <- string(p)
	return len(p), nil
}
func (g sluice) Close() error { return nil }

// A sender that was cancelled before an output is switched off blindly stays silent,
// whether it had not begun, or waited behind another line, or was taken already.
func TestCancelledSenderNeverFollowsAnOff(t *testing.T) {
	for range 50 { // a select takes either of two that are ready
		synctest.Test(t, func(t *testing.T) {
			opt := Options{}.withDefaults()
			g := sluice{make(chan struct{}), make(chan string, 8)}
			w := newWire(g, &opt)
			life, give := context.WithCancel(t.Context())
			go w.send(t.Context(), []byte("A\n"))
			synctest.Wait() // the writer holds A
			waiting := make(chan error, 1)
			go func() { waiting <- w.send(life, []byte("ON\n")) }()
			taken := parcel{ctx: life, data: []byte("FEED\n"), done: make(chan error, 1)}
			go func() { w.out <- taken }() // as by a sender that won its select in the instant before
			synctest.Wait()
			give()
			close(g.let)
			if err := <-waiting; !errors.Is(err, context.Canceled) {
				t.Errorf("the sender that waited: %v", err)
			}
			if err := <-taken.done; !errors.Is(err, errUnsent) || !errors.Is(err, context.Canceled) {
				t.Errorf("the line that was taken: %v", err)
			}
			if err := w.send(life, []byte("ON AGAIN\n")); !errors.Is(err, errUnsent) {
				t.Errorf("a sender whose context is over: %v", err)
			}
			if err := w.send(t.Context(), []byte("OFF\n")); err != nil {
				t.Errorf("off: %v", err)
			}
			w.shut()
			close(g.sent)
			var all []string
			for line := range g.sent {
				all = append(all, line)
			}
			if !slices.Equal(all, []string{"A\n", "OFF\n"}) {
				t.Errorf("sent %q", all)
			}
		})
	}
}

// stuck is a stream whose write survives its Close, as on a serial line held
// back by flow control.
type stuck struct{ free chan struct{} }

func (s stuck) Read([]byte) (int, error) { return 0, nil } // a read time-out of the serial library
func (s stuck) Write(p []byte) (int, error) {
	<-s.free
	return 0, io.ErrClosedPipe
}
func (s stuck) Close() error { return nil }

func TestStuckWriteIsAbandoned(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		opt := Options{}.withDefaults()
		s := stuck{make(chan struct{})}
		w := newWire(s, &opt)
		if err := w.send(t.Context(), []byte("A\n")); !errors.Is(err, ErrTimeout) || !errors.Is(err, errStuck) {
			t.Errorf("send: %v, want a time-out", err)
		}
		start := time.Now()
		if err := w.shut(); !errors.Is(err, ErrTimeout) {
			t.Errorf("shut: %v, want that it was abandoned", err)
		}
		if d := time.Since(start); d != abandonAfter {
			t.Errorf("shut took %v, want %v", d, abandonAfter)
		}
		close(s.free)
	})
}
