package exchange

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"time"

	"nightbench/instruments/link"
)

// Play is an instrument that follows a log. It goes through the log once,
// whatever number of streams are opened: a stream opened after "! lost" goes
// on behind it.
type Play struct {
	turn  chan struct{} // one slot: guards steps, taken for the length of one stream
	steps []Step
	fault chan error // the first departure from the log
	live  []chan struct{}
}

// NewPlay makes a playback of steps.
func NewPlay(steps []Step) *Play {
	p := &Play{turn: make(chan struct{}, 1), steps: steps, fault: make(chan error, 1)}
	p.turn <- struct{}{}
	return p
}

// Dial opens the next stream.
func (p *Play) Dial(ctx context.Context, _ link.Address) (io.ReadWriteCloser, error) {
	select {
	case <-p.turn:
	case <-ctx.Done():
		return nil, ctx.Err()
	}
	ours, theirs := net.Pipe()
	done := make(chan struct{})
	p.live = append(p.live, done)
	go func() {
		defer close(done)
		defer theirs.Close()
		p.follow(theirs)
		p.turn <- struct{}{}
	}()
	return ours, nil
}

// follow plays the steps on one stream until it hangs up, either side.
func (p *Play) follow(c net.Conn) {
	for len(p.steps) > 0 {
		s := p.steps[0]
		switch s.Kind {
		case '>':
			got := make([]byte, len(s.Data))
			n, err := io.ReadFull(c, got)
			if n == 0 && err != nil {
				return // hung up between steps: what is left shows at the end
			}
			if string(got[:n]) != string(s.Data) {
				p.depart(fmt.Errorf("exchange log line %d: expected %q, was sent %q", s.Line, s.Data, got[:n]))
				return
			}
		case '<':
			if _, err := c.Write(s.Data); err != nil {
				p.depart(fmt.Errorf("exchange log line %d: nobody was there to take %q: %w", s.Line, s.Data, err))
				return
			}
		case '.':
			time.Sleep(s.Pause)
		case '!':
			p.steps = p.steps[1:]
			return
		}
		p.steps = p.steps[1:]
	}
	p.surplus(c)
}

// surplus waits for the end of the stream; anything sent before is too much.
func (p *Play) surplus(c net.Conn) {
	more := make([]byte, 256)
	if n, _ := c.Read(more); n > 0 {
		p.depart(fmt.Errorf("the exchange log is at its end, yet %q was sent", more[:n]))
	}
}

func (p *Play) depart(err error) {
	select {
	case p.fault <- err:
	default:
	}
}

// Err waits for the streams to end, which they do when the link is closed,
// and reports the first departure from the log or what was left unused.
func (p *Play) Err() error {
	for _, done := range p.live {
		select {
		case <-done:
		case <-time.After(5 * time.Second):
			return errors.New("a stream of the playback is still open; close the link first")
		}
	}
	select {
	case err := <-p.fault:
		return err
	default:
	}
	if len(p.steps) > 0 {
		s := p.steps[0]
		return fmt.Errorf("exchange log line %d never happened: %c %q (%d steps left)", s.Line, s.Kind, s.Data, len(p.steps))
	}
	return nil
}
