package link

import (
	"errors"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"
)

// dsrLine is a line of 9600 bit/s to an instrument whose buffer holds a few
// bytes and drops DSR when a quarter of it is left.
type dsrLine struct {
	mu       sync.Mutex
	buffer   int // bytes held by the instrument, and how far it is with the next one, ms
	digested int
	room     int
	got      []byte
	overrun  bool
	leaving  int
	lastLook time.Time
	broken   error
}

func (d *dsrLine) ready() (bool, error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	ms := int(time.Since(d.lastLook) / time.Millisecond)
	d.lastLook = d.lastLook.Add(time.Duration(ms) * time.Millisecond)
	moved := min(d.leaving, ms) // a character takes about a millisecond
	d.leaving -= moved
	d.buffer += moved
	d.overrun = d.overrun || d.buffer > d.room
	d.digested += ms // and is digested in five
	d.buffer, d.digested = max(d.buffer-d.digested/5, 0), d.digested%5
	return d.buffer < d.room*3/4, d.broken
}

func (d *dsrLine) send(b []byte) (int, error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	d.got = append(d.got, b...)
	d.leaving += len(b)
	return len(b), nil
}

func (d *dsrLine) unsent() int {
	d.mu.Lock()
	defer d.mu.Unlock()
	return d.leaving
}

func TestDSRHoldsTheWriter(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		line := &dsrLine{room: 32, lastLook: time.Now()}
		g, err := newGate(line)
		if err != nil {
			t.Fatal(err)
		}
		text := strings.Repeat("APPLY 5.0,0.5;", 40)
		n, err := g.write([]byte(text))
		if n != len(text) || err != nil || string(line.got) != text {
			t.Errorf("%d of %d bytes, %v", n, len(text), err)
		}
		if line.overrun {
			t.Error("the instrument's buffer ran over")
		}
	})
}

func TestDSRNeverHeldEndsWithClose(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		line := &dsrLine{lastLook: time.Now()} // no room at all
		g, err := newGate(line)
		if err != nil {
			t.Fatal(err)
		}
		result := make(chan error, 1)
		go func() { _, err := g.write([]byte("OUTP OFF")); result <- err }()
		time.Sleep(time.Minute)
		g.close()
		g.close()
		if err := <-result; !errors.Is(err, errGateShut) {
			t.Errorf("got %v", err)
		}
	})
}

// A pseudo-terminal has no DSR.
func TestDSRThatCannotBeRead(t *testing.T) {
	a, _ := onPty(t, "?flow=dtrdsr")
	if _, err := Open(t.Context(), a, Options{}); err == nil || !strings.Contains(err.Error(), "can't tell its DSR") {
		t.Errorf("got %v", err)
	}
}
