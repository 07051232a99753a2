package link

import (
	"context"
	"errors"
	"io"
	"net"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// piped opens a link whose far ends arrive on the channel, one a dial.
func piped(t *testing.T, opt Options) (*Link, <-chan net.Conn) {
	t.Helper()
	far := make(chan net.Conn, 8)
	opt.Dial = func(context.Context, Address) (io.ReadWriteCloser, error) {
		ours, theirs := net.Pipe()
		far <- theirs
		return ours, nil
	}
	l, err := Open(t.Context(), Address{Scheme: "serial", Path: "/dev/x", text: "serial:///dev/x"}, opt)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l, far
}

// take reads what the link sends, up to n bytes.
func take(t *testing.T, c net.Conn, n int) string {
	t.Helper()
	b := make([]byte, n)
	got, err := io.ReadFull(c, b)
	if err != nil {
		t.Errorf("far end: %v after %q", err, b[:got])
	}
	return string(b[:got])
}

func TestQueryOverPipe(t *testing.T) {
	l, far := piped(t, Options{})
	c := <-far
	for _, reply := range []string{"7\n", "7\r\n", "\r7\n\r", "\n7 \x00\n"} {
		go func() { take(t, c, 3); io.WriteString(c, reply) }()
		if got, err := l.Query(t.Context(), "A?"); err != nil || got != "7" {
			t.Errorf("reply %q read as %q, %v; want 7", reply, got, err)
		}
	}
}

func TestReplyEndsWithCR(t *testing.T) {
	l, far := piped(t, Options{ReplyEnd: '\r'})
	c := <-far
	go func() { take(t, c, 3); io.WriteString(c, "5.00V\r") }()
	if got, err := l.Query(t.Context(), "A?"); err != nil || got != "5.00V" {
		t.Errorf("got %q, %v", got, err)
	}
}

func TestTimeoutThenClearDropsTheLateReply(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{Timeout: time.Second})
		c := <-far
		go func() {
			take(t, c, 3)
			time.Sleep(1050 * time.Millisecond) // while the link is being cleared
			io.WriteString(c, "late\n")
			take(t, c, 3)
			io.WriteString(c, "right\n")
		}()
		if _, err := l.Query(t.Context(), "A?"); !errors.Is(err, ErrTimeout) {
			t.Errorf("first: %v, want ErrTimeout", err)
		}
		if got, err := l.Query(t.Context(), "B?"); err != nil || got != "right" {
			t.Errorf("second: %q, %v; want right", got, err)
		}
		l.Close()
	})
}

func TestContextEndsARead(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{})
		go take(t, <-far, 3)
		cause := errors.New("the run was stopped")
		ctx, cancel := context.WithCancelCause(t.Context())
		time.AfterFunc(time.Second, func() { cancel(cause) })
		start := time.Now()
		if _, err := l.Query(ctx, "A?"); !errors.Is(err, cause) || errors.Is(err, ErrTimeout) {
			t.Errorf("cancelled: %v", err)
		}
		if d := time.Since(start); d != time.Second {
			t.Errorf("took %v, want 1 s", d)
		}
		ctx, cancel2 := context.WithTimeout(t.Context(), time.Second)
		defer cancel2()
		if _, err := l.Query(ctx, "A?"); !errors.Is(err, ErrTimeout) || !errors.Is(err, context.DeadlineExceeded) {
			t.Errorf("deadline: %v, want both kinds", err)
		}
		l.Close()
	})
}

func TestTurnsAreOneAtATime(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{})
		c := <-far
		go func() {
			for range 20 {
				q := take(t, c, 3)
				time.Sleep(10 * time.Millisecond)
				io.WriteString(c, strings.ToLower(q))
			}
		}()
		done := make(chan error)
		for i := range 20 {
			q := string(rune('A'+i)) + "?"
			go func() {
				got, err := l.Query(t.Context(), q)
				if got != strings.ToLower(q) {
					t.Errorf("%s answered with %q", q, got)
				}
				done <- err
			}()
		}
		for range 20 {
			if err := <-done; err != nil {
				t.Error(err)
			}
		}
		l.Close()
	})
}

func TestCloseDuringARead(t *testing.T) {
	l, far := piped(t, Options{})
	c := <-far
	result := make(chan error, 1)
	go func() { _, err := l.Query(t.Context(), "A?"); result <- err }()
	take(t, c, 3)
	first := make(chan error, 2)
	for range 2 {
		go func() { first <- l.Close() }()
	}
	if err := errors.Join(<-first, <-first, l.Close()); err != nil {
		t.Errorf("Close: %v", err)
	}
	if err := <-result; !errors.Is(err, ErrClosed) {
		t.Errorf("read: %v, want ErrClosed", err)
	}
	if _, err := l.Query(t.Context(), "A?"); !errors.Is(err, ErrClosed) {
		t.Errorf("after Close: %v, want ErrClosed", err)
	}
	if _, err := l.Blind(t.Context(), "A"); !errors.Is(err, ErrClosed) {
		t.Errorf("Blind after Close: %v, want ErrClosed", err)
	}
	if err := l.Reopen(t.Context()); !errors.Is(err, ErrClosed) {
		t.Errorf("Reopen after Close: %v, want ErrClosed", err)
	}
}

func TestLostAndReopened(t *testing.T) {
	l, far := piped(t, Options{})
	(<-far).Close()
	_, err := l.Query(t.Context(), "A?")
	if !errors.Is(err, ErrLost) {
		t.Fatalf("hung up: %v, want ErrLost", err)
	}
	var e *Error
	if !errors.As(err, &e) || e.Address != "serial:///dev/x" || e.Hint == "" {
		t.Errorf("the fault %#v lacks address or hint", e)
	}
	if err := l.Reopen(t.Context()); err != nil {
		t.Fatal(err)
	}
	c := <-far
	go func() {
		if got := take(t, c, 4); got != "\nA?\n" {
			t.Errorf("after a torn line came %q, want a terminator first", got)
		}
		io.WriteString(c, "ok\n")
	}()
	if got, err := l.Query(t.Context(), "A?"); err != nil || got != "ok" {
		t.Errorf("after Reopen: %q, %v", got, err)
	}
}

func TestReadFullSaysHowMuchCame(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{})
		c := <-far
		go func() {
			for range 10 { // slower than the time-out as a whole, but never silent so long
				time.Sleep(3 * time.Second)
				io.WriteString(c, "\n")
			}
			io.WriteString(c, "abc")
		}()
		turn, err := l.Acquire(t.Context())
		if err != nil {
			t.Fatal(err)
		}
		defer turn.Release()
		if got, err := turn.ReadFull(t.Context(), 10); err != nil || len(got) != 10 {
			t.Errorf("got %q, %v", got, err)
		}
		got, err := turn.ReadFull(t.Context(), 5)
		if !errors.Is(err, ErrTimeout) || string(got) != "abc" || !strings.Contains(err.Error(), "got 3 of 5 bytes") {
			t.Errorf("short: %q, %v", got, err)
		}
		l.Close()
	})
}

func TestLimits(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		l, far := piped(t, Options{ReplyLimit: 100, ClearLimit: time.Second})
		c := <-far
		over := make(chan struct{})
		go func() {
			defer close(over)
			take(t, c, 3)
			for {
				if _, err := io.WriteString(c, "blah blah "); err != nil {
					return
				}
				time.Sleep(10 * time.Millisecond)
			}
		}()
		if _, err := l.Query(t.Context(), "A?"); !errors.Is(err, ErrTooLong) {
			t.Errorf("endless line: %v, want ErrTooLong", err)
		}
		if err := l.Clear(t.Context()); !errors.Is(err, ErrBabble) {
			t.Errorf("clear: %v, want ErrBabble", err)
		}
		l.Close()
		<-over
	})
}

func TestTraceSeesBothDirections(t *testing.T) {
	events := make(chan Event, 8)
	l, far := piped(t, Options{Trace: func(e Event) { events <- e }})
	c := <-far
	go func() { take(t, c, 3); io.WriteString(c, "7\n") }()
	if _, err := l.Query(t.Context(), "A?"); err != nil {
		t.Fatal(err)
	}
	seen := map[Direction]string{}
	for range 2 {
		e := <-events
		seen[e.Dir] = string(e.Data)
		if e.Time.IsZero() {
			t.Error("an event has no time")
		}
	}
	if seen[Out] != "A?\n" || seen[In] != "7\n" {
		t.Errorf("trace %q", seen)
	}
}
