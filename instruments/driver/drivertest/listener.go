// Package drivertest holds small instruments for tests of whatever talks to one.
// Those that speak the standard dialects are written from the promises in the
// dialect files; those of makers, each in a file named for its maker, from the
// instrument's side of the manual. Both apart from the drivers: an error in one
// shows in the other. They know no physics; the practice bench does.
package drivertest

import (
	"bufio"
	"context"
	"io"
	"net"
	"slices"
	"strings"
	"sync"
	"time"

	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// Fate is what befalls a message.
type Fate struct {
	Delay time.Duration // before it is carried out
	Mute  bool          // it is carried out, and its reply lost
	Drop  bool          // it never arrives
	Reply string        // in place of the device's own reply
}

// Listener is the instrument's end of a link. Set its fields before the first
// message arrives.
type Listener struct {
	Device *scpi.Device
	Fate   func(message string) Fate // nil: nothing befalls any
	AtOnce func(message string) bool // obeyed while another message is being carried out; true when it was one of those
	Refuse error                     // of opening

	mu   sync.Mutex // guards what follows
	got  []string
	on   []net.Conn
	turn chan struct{} // one slot: messages of all connections are carried out one at a time
}

// Dial gives one end of a pipe and listens on the other.
func (l *Listener) Dial(context.Context, link.Address) (io.ReadWriteCloser, error) {
	if l.Refuse != nil {
		return nil, l.Refuse
	}
	near, far := net.Pipe()
	l.mu.Lock()
	l.on = append(l.on, far)
	if l.turn == nil {
		l.turn = make(chan struct{}, 1)
	}
	turn := l.turn
	l.mu.Unlock()
	messages := make(chan string, 64)
	go l.receive(far, messages)
	go l.serve(far, messages, turn)
	return near, nil
}

// Unplug hangs up on whoever is connected.
func (l *Listener) Unplug() {
	l.mu.Lock()
	defer l.mu.Unlock()
	for _, c := range l.on {
		c.Close()
	}
	l.on = nil
}

// Received is every message so far, in order.
func (l *Listener) Received() []string {
	l.mu.Lock()
	defer l.mu.Unlock()
	return slices.Clone(l.got)
}

// Count is how often a message was received.
func (l *Listener) Count(message string) (n int) {
	for _, m := range l.Received() {
		if m == message {
			n++
		}
	}
	return n
}

func (l *Listener) receive(c net.Conn, messages chan<- string) {
	defer close(messages)
	for in := bufio.NewScanner(c); in.Scan(); {
		message := strings.TrimRight(in.Text(), "\r")
		if message == "" {
			continue
		}
		l.mu.Lock()
		l.got = append(l.got, message)
		l.mu.Unlock()
		if l.AtOnce == nil || !l.AtOnce(message) {
			messages <- message
		}
	}
}

func (l *Listener) serve(c net.Conn, messages <-chan string, turn chan struct{}) {
	defer c.Close()
	for message := range messages {
		var f Fate
		if l.Fate != nil {
			f = l.Fate(message)
		}
		if f.Drop {
			continue
		}
		time.Sleep(f.Delay)
		turn <- struct{}{}
		reply := l.Device.Execute(context.Background(), []byte(message))
		<-turn
		if f.Reply != "" {
			reply = []byte(f.Reply)
		}
		if len(reply) > 0 && !f.Mute {
			if _, err := c.Write(reply); err != nil {
				for range messages { // the link is gone; the rest was sent in vain
				}
				return
			}
		}
	}
}
