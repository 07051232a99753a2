package link

import (
	"errors"
	"io"
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
