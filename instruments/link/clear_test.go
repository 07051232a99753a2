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
)

// brokenLine is a serial line whose break the other side answers.
type brokenLine struct {
	net.Conn
	onBreak func()
}

func (b brokenLine) Break() error {
	if b.onBreak == nil {
		return errors.New("the cable is out")
	}
	b.onBreak()
	return nil
}

// Tektronix on RS-232: a break is the device clear, DCL and the end of line the
// answer when it is done (TDS200 programmer manual pp. 2-114 to 2-119).
func TestClearByBreak(t *testing.T) {
	for _, c := range []struct {
		name, says string
		after      time.Duration
		err        string
	}{
		{"Answered", "12.5\r\nDCL\r\n", 700 * time.Millisecond, ""},
		{"NotAnswered", "12.5\r\n", 700 * time.Millisecond, `not answered by "DCL"`},
	} {
		t.Run(c.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				ours, theirs := net.Pipe()
				line := brokenLine{ours, func() {
					go func() { time.Sleep(c.after); io.WriteString(theirs, c.says) }()
				}}
				l := overStream(t, line, Options{ClearBreak: true, ClearReply: "DCL"})
				err := l.Clear(t.Context())
				if (err == nil) != (c.err == "") || err != nil && (!errors.Is(err, ErrTimeout) || !strings.Contains(err.Error(), c.err)) {
					t.Errorf("got %v, want %q", err, c.err)
				}
				theirs.Close()
				l.Close()
			})
		})
	}
}

func TestBreakThatFails(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		l := overStream(t, brokenLine{Conn: ours}, Options{ClearBreak: true})
		if err := l.Clear(t.Context()); err == nil || !strings.Contains(err.Error(), "send a break: the cable is out") {
			t.Errorf("got %v", err)
		}
		theirs.Close()
		l.Close()
	})
}

// A pseudo-terminal takes a break and passes none on.
func TestBreakOnATerminal(t *testing.T) {
	a, _ := onPty(t, "")
	l, err := Open(t.Context(), a, Options{ClearBreak: true, Quiet: 10 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if err := l.Clear(t.Context()); err != nil {
		t.Error(err)
	}
}

// An empty line can't be told from a terminator left over, so it is no reply;
// the time-out says that one came.
func TestEmptyLineIsNoReply(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		go func() {
			b := make([]byte, 16)
			theirs.Read(b)
			io.WriteString(theirs, "\r\n")
		}()
		l := overStream(t, ours, Options{Timeout: time.Second})
		if _, err := l.Query(t.Context(), "SYST:LABEL?"); !errors.Is(err, ErrTimeout) || !strings.Contains(err.Error(), "only an empty line came") {
			t.Errorf("got %v", err)
		}
		theirs.Close()
		l.Close()
	})
}

// A talker that ends its replies with CR alone.
func TestReplyEndedByCR(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ours, theirs := net.Pipe()
		go func() {
			b := make([]byte, 16)
			for {
				if _, err := theirs.Read(b); err != nil {
					return
				}
				io.WriteString(theirs, "5.000\r")
			}
		}()
		l := overStream(t, ours, Options{ReplyEnd: '\r'})
		for range 2 {
			if got, err := l.Query(t.Context(), "VOUT1?"); err != nil || got != "5.000" {
				t.Errorf("got %q, %v", got, err)
			}
		}
		theirs.Close()
		l.Close()
	})
}

func overStream(t *testing.T, rw io.ReadWriteCloser, opt Options) *Link {
	t.Helper()
	a, err := Parse("serial:///dev/ttyS77")
	if err != nil {
		t.Fatal(err)
	}
	opt.Dial = func(context.Context, Address) (io.ReadWriteCloser, error) { return rw, nil }
	l, err := Open(t.Context(), a, opt)
	if err != nil {
		t.Fatal(err)
	}
	return l
}
