package scpi

import (
	"errors"
	"testing"
	"time"

	"github.com/creack/pty"

	"nightbench/instruments/link"
)

// The whole way over a real pseudo-terminal: opening, lock, raw mode, pumps.
func TestClientAgainstDeviceOverPty(t *testing.T) {
	master, slave, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	s := newSupply()
	done := make(chan struct{})
	go func() { defer close(done); serve(t.Context(), master, s.Device) }()
	a, err := link.Parse("serial://" + slave.Name() + "?baud=115200")
	if err != nil {
		t.Fatal(err)
	}
	l, err := link.Open(t.Context(), a, link.Options{Timeout: 200 * time.Millisecond, Quiet: 20 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	c := New(l, Options{})
	if id, err := c.Identify(t.Context()); err != nil || id.Model != "PS-1" {
		t.Errorf("identity %+v, %v", id, err)
	}
	for range 20 {
		if n, err := c.QueryNumber(t.Context(), "MEAS:VOLT?"); err != nil || n.Outcome != Measured {
			t.Errorf("MEAS:VOLT? %+v, %v", n, err)
		}
	}
	if _, err := c.Query(t.Context(), "FOO?"); !errors.Is(err, link.ErrTimeout) {
		t.Errorf("an unknown query: %v, want a time-out", err)
	}
	if n, err := c.QueryNumber(t.Context(), "VOLT? MAX"); err != nil || n.Value != 32 {
		t.Errorf("VOLT? MAX %+v, %v", n, err)
	}
	if err := errors.Join(c.Blind(t.Context(), "OUTP OFF"), l.Close(), slave.Close(), master.Close()); err != nil {
		t.Error(err)
	}
	<-done
}
