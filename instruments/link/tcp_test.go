package link

import (
	"bufio"
	"context"
	"errors"
	"io"
	"net"
	"strings"
	"testing"
	"time"
)

// listen serves connections one after the other with fn.
func listen(t *testing.T, fn func(net.Conn)) Address {
	t.Helper()
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	done := make(chan struct{})
	go func() {
		defer close(done)
		for {
			c, err := ln.Accept()
			if err != nil {
				return
			}
			fn(c)
			c.Close()
		}
	}()
	t.Cleanup(func() { ln.Close(); <-done })
	a, err := Parse("tcp://" + ln.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// A reply cut into packets of one byte, and two replies in one packet, are
// told apart by their ends alone.
func TestTCPPacketsDoNotMatter(t *testing.T) {
	a := listen(t, func(c net.Conn) {
		in := bufio.NewScanner(c)
		for in.Scan() {
			for _, b := range []byte("got " + in.Text() + "\r\n") {
				c.Write([]byte{b})
			}
		}
	})
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	turn, err := l.Acquire(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer turn.Release()
	if err := turn.Send(t.Context(), "A?\nB?"); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"got A?", "got B?"} {
		if got, err := turn.ReadLine(t.Context()); err != nil || got != want {
			t.Errorf("got %q, %v; want %q", got, err, want)
		}
	}
}

func TestTCPHungUpAndReopened(t *testing.T) {
	a := listen(t, func(c net.Conn) { // one answer a connection
		in := bufio.NewScanner(c)
		if in.Scan() {
			io.WriteString(c, strings.ToLower(in.Text())+"\n")
		}
	})
	l, err := Open(t.Context(), a, Options{Timeout: time.Second})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	for range 3 {
		if got, err := l.Query(t.Context(), "A?"); err != nil || got != "a?" {
			t.Errorf("got %q, %v", got, err)
		}
		if _, err := l.Query(t.Context(), "B?"); !errors.Is(err, ErrLost) {
			t.Errorf("after the hanging up: %v, want ErrLost", err)
		}
		if err := l.Reopen(t.Context()); err != nil {
			t.Fatal(err)
		}
	}
}

func TestTCPNobodyThere(t *testing.T) {
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	a, err := Parse("tcp://" + ln.Addr().String())
	ln.Close()
	if err != nil {
		t.Fatal(err)
	}
	_, err = Open(t.Context(), a, Options{})
	var e *Error
	if !errors.As(err, &e) || e.Op != "open" || !strings.Contains(err.Error(), "is it switched on") {
		t.Errorf("got %v, want a hint", err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := Open(ctx, a, Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
}

// Two links of one computer never share a socket, however its address is spelt.
func TestTCPIsHeldByOneLink(t *testing.T) {
	a := listen(t, func(c net.Conn) { io.Copy(c, c) })
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	again, err := Parse("tcp://[::ffff:127.0.0.1]:" + a.Host[strings.LastIndex(a.Host, ":")+1:])
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Open(t.Context(), again, Options{}); !errors.Is(err, ErrBusy) || !strings.Contains(err.Error(), "on this computer") {
		t.Errorf("second link: %v, want ErrBusy", err)
	}
	if err := l.Reopen(t.Context()); err != nil {
		t.Errorf("reopen: %v", err)
	}
	l.Close()
	l, err = Open(t.Context(), again, Options{})
	if err != nil {
		t.Fatalf("after it was closed: %v", err)
	}
	l.Close()
}
