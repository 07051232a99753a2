package scpi

import (
	"context"
	"errors"
	"io"
	"net"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"nightbench/instruments/link"
)

// redialled opens a connection to a socket that is served by each of serve in
// turn, one a dial.
func redialled(t *testing.T, opt Options, lopt link.Options, serve ...func(net.Conn)) *Conn {
	t.Helper()
	a, err := link.Parse("tcp://instrument.invalid:5025")
	if err != nil {
		t.Fatal(err)
	}
	lopt.Timeout = time.Second
	lopt.Dial = func(context.Context, link.Address) (io.ReadWriteCloser, error) {
		if len(serve) == 0 {
			return nil, errors.New("connection refused")
		}
		ours, theirs := net.Pipe()
		fn := serve[0]
		serve = serve[1:]
		go func() { fn(theirs); theirs.Close() }()
		return ours, nil
	}
	l, err := link.Open(t.Context(), a, lopt)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close(); synctest.Wait() })
	return New(l, opt)
}

func deaf(c net.Conn)     { io.Copy(io.Discard, c) }
func answers(c net.Conn)  { scripted(c, map[string]string{"VOLT?": "5\n"}) }
func impostor(c net.Conn) { scripted(renamed{c}, map[string]string{"VOLT?": "6\n"}) }

// renamed answers with another serial number.
type renamed struct{ net.Conn }

func (r renamed) Write(p []byte) (int, error) {
	_, err := io.WriteString(r.Conn, strings.Replace(string(p), "PS-1,0", "PS-1,99", 1))
	return len(p), err
}

func TestDeafSocketIsOpenedAnew(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := redialled(t, Options{}, link.Options{}, deaf, answers)
		if got, err := c.Query(t.Context(), "VOLT?"); err != nil || got != "5" {
			t.Errorf("got %q, %v", got, err)
		}
	})
}

func TestDeafSocketThatRefuses(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := redialled(t, Options{}, link.Options{}, deaf)
		_, err := c.Query(t.Context(), "VOLT?")
		if !errors.Is(err, ErrOutOfStep) || !strings.Contains(err.Error(), "connection refused") {
			t.Errorf("got %v, want both causes", err)
		}
		if err := c.Blind(t.Context(), "OUTP OFF"); err == nil {
			t.Error("blind to nobody is no success")
		}
	})
}

func TestReopenWantsTheSameInstrument(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		hangUp := func(c net.Conn) { answers(limited{c, new(int)}) }
		c := redialled(t, Options{}, link.Options{}, hangUp, answers, impostor, impostor)
		if _, err := c.Query(t.Context(), "VOLT?"); err != nil {
			t.Fatal(err)
		}
		if _, err := c.Query(t.Context(), "VOLT?"); !errors.Is(err, link.ErrLost) {
			t.Errorf("hung up: %v, want ErrLost", err)
		}
		if err := c.Reopen(t.Context()); err != nil {
			t.Fatalf("reopen: %v", err)
		}
		if got, err := c.Query(t.Context(), "VOLT?"); err != nil || got != "5" {
			t.Errorf("after reopening: %q, %v", got, err)
		}
		if err := c.Reopen(t.Context()); !errors.Is(err, ErrOther) {
			t.Errorf("another serial number: %v, want ErrOther", err)
		}
		if _, err := c.Query(t.Context(), "VOLT?"); err == nil {
			t.Error("another instrument was asked")
		}
	})
}

// limited hangs up after three lines.
type limited struct {
	net.Conn
	lines *int
}

func (l limited) Read(p []byte) (int, error) {
	if *l.lines == 3 {
		return 0, io.EOF
	}
	*l.lines++
	return l.Conn.Read(p)
}

func TestNoMarker(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ask := "> STATUS?\\n\n< GW 01000000\\n\n"
		c := play(t, ask+ask+"> VOUT1?\\n\n< 5.00V\\n\n", Options{IdentityQuery: "STATUS?", NoMarker: true, Numbers: NumberForm{Units: []string{"V"}}})
		if n, err := c.QueryNumber(t.Context(), "VOUT1?"); err != nil || n.Value != 5 {
			t.Errorf("got %+v, %v", n, err)
		}
	})
}

// The byte 0x03 is the device clear of HP's serial instruments (Keysight
// E3632A User's Guide p. 61).
func TestClearBytesComeFirst(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		got := make(chan string, 1)
		c := redialled(t, Options{}, link.Options{ClearBytes: []byte{3}}, func(c net.Conn) {
			b := make([]byte, 1)
			io.ReadFull(c, b)
			got <- string(b)
			answers(c)
		})
		if err := c.Resync(t.Context()); err != nil || <-got != "\x03" {
			t.Errorf("resync: %v", err)
		}
		if err := c.Resync(t.Context()); err != nil {
			t.Errorf("in step already: %v", err)
		}
	})
}

func TestIdentifyNoticesGarbage(t *testing.T) {
	for _, replies := range []string{"< \\xf8\\x81\\n\n> *IDN?\\n\n< \\xf8\\x81\\n\n", "< A\\n\n> *IDN?\\n\n< B\\n\n"} {
		synctest.Test(t, func(t *testing.T) {
			c := play(t, "> *IDN?\\n\n"+replies, Options{})
			if id, err := c.Identify(t.Context()); !errors.Is(err, ErrFraming) || !strings.Contains(err.Error(), "baud rate") {
				t.Errorf("got %+v, %v", id, err)
			}
		})
	}
}

// A first proof must not take the reply to something else for an identity.
func TestNumberIsNoIdentity(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, "> *IDN?\\n\n< 1\\n\n. 10ms\n< "+self+"\\n\n"+inStep+"> VOLT?\\n\n< 5\\n", Options{})
		if got, err := c.Query(t.Context(), "VOLT?"); err != nil || got != "5" {
			t.Errorf("got %q, %v", got, err)
		}
	})
}

func TestQueryAfterCancelIsProvenAgain(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		c := play(t, inStep+"> READ?\\n\n. 400ms\n< 7\\n\n"+inStep+"> VOLT?\\n\n< 5\\n", Options{})
		ctx, cancel := context.WithTimeoutCause(t.Context(), 460*time.Millisecond, errors.New("the run was stopped"))
		defer cancel()
		if _, err := c.Query(ctx, "READ?"); !errors.Is(err, link.ErrTimeout) || !strings.Contains(err.Error(), "the run was stopped") {
			t.Errorf("got %v", err)
		}
		if got, err := c.Query(t.Context(), "VOLT?"); err != nil || got != "5" {
			t.Errorf("got %q, %v", got, err)
		}
	})
}
