package scpi

import (
	"bytes"
	"context"
	"errors"
	"slices"
	"strings"
)

// Device is the listening side of an instrument: its tree of headers, its
// error queue and status, and the exchange of messages. It knows the common
// commands and the mandatory SYSTem and STATus headers; others are registered
// with Set, Get and Value. It is not safe for use by several goroutines:
// whoever serves it lets one message in at a time.
type Device struct {
	Tree
	Status Status
	Queue  *ErrorQueue

	// Identity is the reply to *IDN?.
	Identity string
	// Reset is called for *RST; nil does nothing.
	Reset func()
	// SelfTest is called for *TST?; 0 is passed. nil passes.
	SelfTest func(context.Context) int
	// Pending says whether an overlapped operation is going on; nil means
	// that every command completes before the next.
	Pending func() bool
	// Wait waits for pending operations, for *OPC? and *WAI; nil does not.
	Wait func(context.Context) error

	opcAsked bool   // *OPC waits for pending operations
	output   []byte // response not read yet
	saying   bool   // a response of the message in hand is complete: MAV
}

// NewDevice makes a device that has just been switched on, with an error
// queue of the given depth.
func NewDevice(identity string, depth int) *Device {
	d := &Device{Identity: identity, Queue: NewErrorQueue(depth)}
	d.registerCommon()
	d.registerStatus()
	d.Status.Raise(EventPON)
	return d
}

// Push queues an error and raises the bit of its class.
func (d *Device) Push(err error) {
	f := asFault(err)
	d.Status.Raise(eventFor(f.Code))
	d.Queue.Push(f)
}

func asFault(err error) Fault {
	var f Fault
	if errors.As(err, &f) {
		return f
	}
	return NewFault(DeviceError, err.Error())
}

// Completed tells the device that pending operations have ended.
func (d *Device) Completed() {
	if d.opcAsked {
		d.opcAsked = false
		d.Status.Raise(EventOPC)
	}
}

// Execute carries out one message, without its NL, and returns the response
// with its NL, or nil. It is the exchange of a stream, where a response is
// sent at once and can't be interrupted.
func (d *Device) Execute(ctx context.Context, message []byte) []byte {
	d.Write(ctx, message)
	out := d.output
	d.output = nil
	return out
}

// Write carries out one message and keeps the response for Read. A response
// not read before is discarded and queues -410.
func (d *Device) Write(ctx context.Context, message []byte) {
	if d.output != nil {
		d.output = nil
		d.Push(NewFault(QueryInterrupted, ""))
	}
	responses := d.run(ctx, message)
	d.saying = false
	if len(responses) > 0 {
		d.output = append([]byte(strings.Join(responses, ";")), '\n')
	}
}

// Read takes the response; without one it queues -420 and returns nil.
func (d *Device) Read() []byte {
	out := d.output
	d.output = nil
	if out == nil {
		d.Push(NewFault(QueryUnterminated, ""))
	}
	return out
}

// Clear is a device clear: what is in the output is dropped; settings, status
// and errors stay.
func (d *Device) Clear() {
	d.output, d.opcAsked = nil, false
}

// run carries out the units of a message. After a command error the rest of
// the message is dropped; after any other error it goes on.
func (d *Device) run(ctx context.Context, message []byte) (responses []string) {
	var path []string
	free := false // a response of free text came before
	for p := NewParser(bytes.TrimRight(message, "\r\n")); ; {
		u, ok, err := p.Next()
		if err == nil && !ok {
			return responses
		}
		var response string
		switch {
		case err == nil && u.Query && free:
			err = NewFault(UnterminatedAfterFree, u.String())
		case err == nil:
			response, path, err = d.unit(ctx, u, path)
		}
		if err != nil {
			f := asFault(err)
			d.Push(f)
			if class := f.Code / 100; class == -1 || class == -4 {
				return responses
			}
			continue
		}
		if u.Query {
			responses = append(responses, response)
			d.saying = true
			free = u.Common && u.Nodes[0] == "IDN"
		}
	}
}

// unit carries out one unit, and gives the path for the next: the header up
// to its last colon, as sent. A common command leaves the path as it was.
func (d *Device) unit(ctx context.Context, u Unit, path []string) (string, []string, error) {
	words := u.Nodes
	switch {
	case u.Common:
		words = []string{"*" + u.Nodes[0]}
	case u.Rooted:
		path = words[:len(words)-1]
	default:
		words = slices.Concat(path, words)
		path = words[:len(words)-1]
	}
	e, suffix, err := d.find(words, u.Query)
	if err != nil {
		return "", path, at(err, u)
	}
	args, err := readArgs(e.args, u.Params)
	if err != nil {
		return "", path, at(err, u)
	}
	header := strings.Join(words, ":")
	if u.Query {
		header += "?"
	}
	response, err := e.run(&Call{Context: ctx, Header: header, Suffix: suffix, args: args})
	return response, path, err
}

// at adds the header to a fault that has no device information yet.
func at(err error, u Unit) error {
	f := asFault(err)
	if strings.Contains(f.Text, ";") {
		return f
	}
	return NewFault(f.Code, u.String())
}
