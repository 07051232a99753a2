package link

import (
	"errors"
	"fmt"
	"sync"
	"time"
)

// gated is a line whose other side says by DSR whether it can take more.
type gated interface {
	ready() (bool, error)
	send(b []byte) (int, error)
	unsent() int // bytes that the system still holds
}

// gate does the flow control by DTR and DSR, which the system can't: bytes go
// out a few at a time, each lot when the one before has left and DSR is held.
// Our own DTR stays on, since this side always reads.
type gate struct {
	line gated
	stop chan struct{}
	once sync.Once
}

// gateLot is how many bytes may be on their way when DSR drops: an instrument
// drops it with some room left (about a quarter of its 100 characters on HP's:
// a guess, common practice, no source).
const gateLot = 8

// gateEvery is the pause between two looks at DSR: eight characters at 9600 bit/s take 8 ms.
const gateEvery = time.Millisecond

// newGate refuses a line that has no DSR, such as a pseudo-terminal.
func newGate(l gated) (*gate, error) {
	if _, err := l.ready(); err != nil {
		return nil, fmt.Errorf("flow=dtrdsr: this line can't tell its DSR: %w; use flow=none, and commands short enough for the instrument's buffer", err)
	}
	return &gate{line: l, stop: make(chan struct{})}, nil
}

func (g *gate) write(b []byte) (sent int, err error) {
	for sent < len(b) {
		if err := g.wait(); err != nil {
			return sent, err
		}
		n, err := g.line.send(b[sent:min(sent+gateLot, len(b))])
		sent += n
		if err != nil {
			return sent, err
		}
	}
	return sent, nil
}

var errGateShut = errors.New("the line was closed while the instrument held DSR off")

// wait waits until the last lot has left and DSR is held.
func (g *gate) wait() error {
	for {
		held, err := g.line.ready()
		if err != nil {
			return err
		}
		if held && g.line.unsent() == 0 {
			return nil
		}
		select {
		case <-time.After(gateEvery):
		case <-g.stop:
			return errGateShut
		}
	}
}

func (g *gate) close() { g.once.Do(func() { close(g.stop) }) }
