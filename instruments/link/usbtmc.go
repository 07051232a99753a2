package link

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"sync"
	"syscall"
	"time"
)

// The requests of the Linux usbtmc driver, as linux/usb/tmc.h defines them
// (type 91; the encoding of x86-64 and arm64).
const (
	tmcClear      = 0x5b02     // no argument
	tmcSetTimeout = 0x40045b0a // uint32, ms
	tmcEOMEnable  = 0x40015b0b // uint8: end each write with END
	tmcTermChar   = 0x40025b0c // uint8 character, uint8 enabled
	tmcGetCaps    = 0x80015b11 // uint8 bitmap of USB488
	tmcReadSTB    = 0x80015b12 // uint8 status byte
	tmcAttributes = 0x80015b18 // uint8: of the latest reply; bit 0 is END
)

// messageAvailable is bit 4 of the status byte: a reply is there (IEEE 488.2).
const messageAvailable = 1 << 4

// tmcDevice is the device file. Control passes the argument of an ioctl, in
// and out, in the byte order of the machine.
type tmcDevice interface {
	Read(b []byte) (int, error)
	Write(b []byte) (int, error)
	Control(request uint, arg []byte) error
	Close() error
}

// usbtmc is a USB instrument behind the Linux usbtmc driver, which frames the
// messages. A reply is read only when one is owed and expected: a read without
// need is an error to the instrument. The status byte tells when it is there,
// so that no read holds the driver while a line has to be sent blind; a device
// that has no status byte is read at once, and the driver waits.
//
// Not tried on a device: tested against recorded calls of the driver.
type usbtmc struct {
	dev  tmcDevice
	want chan time.Duration // room for one: how long a reply may take
	stop chan struct{}
	once sync.Once

	mu     sync.Mutex // guards what follows
	owed   bool       // a message was sent, and its reply has not come whole
	inside bool       // a part of a reply has come
	status bool       // the status byte tells when a reply is there
}

// newUSBTMC sets a device up: no termination character, which could occur
// inside a block, and END with each message. Both are what the driver does by
// itself since Linux 4.20; an older one that refuses to be told is refused.
func newUSBTMC(dev tmcDevice) (*usbtmc, error) {
	u := &usbtmc{dev: dev, want: make(chan time.Duration, 1), stop: make(chan struct{})}
	for _, set := range []struct {
		request uint
		arg     []byte
		words   string
	}{{tmcTermChar, []byte{'\n', 0}, "switch the termination character off"}, {tmcEOMEnable, []byte{1}, "end messages with END"}} {
		if err := dev.Control(set.request, set.arg); err != nil {
			return nil, fmt.Errorf("%s: %w; Linux 4.20 or newer is needed", set.words, err)
		}
	}
	caps, stb := []byte{0}, []byte{0}
	u.status = dev.Control(tmcGetCaps, caps) == nil && dev.Control(tmcReadSTB, stb) == nil
	return u, nil
}

// Expect lets one reply come, if one is owed.
func (u *usbtmc) Expect(d time.Duration) {
	u.mu.Lock()
	defer u.mu.Unlock()
	if !u.owed || u.inside {
		return
	}
	select {
	case u.want <- d:
	default:
	}
}

// Write sends one message; the driver ends it with END.
func (u *usbtmc) Write(b []byte) (int, error) {
	n, err := u.dev.Write(b)
	if err == nil {
		u.mu.Lock()
		u.owed = true
		u.mu.Unlock()
	}
	return n, err
}

// Read waits until a reply is expected and gives it, ended by NL whether the
// instrument sent one or not. A reply that does not come in time is (0, nil).
func (u *usbtmc) Read(b []byte) (int, error) {
	within := time.Second // for the rest of a reply that has begun
	if !u.isInside() {
		select {
		case within = <-u.want:
		case <-u.stop:
			return 0, errShut
		}
		if there, err := u.awaitReply(within); err != nil || !there {
			return 0, err
		}
	}
	if err := u.allow(within); err != nil {
		return 0, err
	}
	n, err := u.dev.Read(b[:len(b)-1]) // room for an NL
	if errors.Is(err, syscall.ETIMEDOUT) {
		u.mu.Lock()
		u.inside = false
		u.mu.Unlock()
		return 0, nil
	}
	if err != nil {
		return 0, err
	}
	if u.ended(n, len(b)-1) && (n == 0 || b[n-1] != '\n') {
		b[n] = '\n'
		n++
	}
	return n, nil
}

func (u *usbtmc) isInside() bool {
	u.mu.Lock()
	defer u.mu.Unlock()
	return u.inside
}

// statusEvery is the pause between two looks at the status byte.
const statusEvery = 2 * time.Millisecond

// awaitReply looks at the status byte until it says that a reply is there. A
// device without one is taken to have it.
func (u *usbtmc) awaitReply(within time.Duration) (bool, error) {
	u.mu.Lock()
	status := u.status
	u.mu.Unlock()
	if !status {
		return true, nil
	}
	for late := time.Now().Add(within); ; {
		stb := []byte{0}
		switch err := u.dev.Control(tmcReadSTB, stb); {
		case err != nil:
			return false, err
		case stb[0]&messageAvailable != 0:
			return true, nil
		case time.Now().After(late):
			return false, nil
		}
		select {
		case <-time.After(statusEvery):
		case <-u.stop:
			return false, errShut
		}
	}
}

// allow gives the driver the time for the next read.
func (u *usbtmc) allow(d time.Duration) error {
	ms := binary.NativeEndian.AppendUint32(nil, uint32(max(d.Milliseconds(), 1)))
	if err := u.dev.Control(tmcSetTimeout, ms); err != nil {
		return fmt.Errorf("set the time-out: %w", err)
	}
	return nil
}

// ended asks whether the reply is whole: by its END, or with a driver that
// does not tell, by being shorter than was asked for.
func (u *usbtmc) ended(n, most int) bool {
	attributes := []byte{0}
	end := n < most
	if err := u.dev.Control(tmcAttributes, attributes); err == nil {
		end = attributes[0]&1 != 0
	}
	u.mu.Lock()
	defer u.mu.Unlock()
	u.inside = !end
	if end {
		u.owed = false
	}
	return end
}

// Clear is the device clear of USBTMC: the driver aborts what is going on,
// tells the instrument and waits until it says that it is done.
func (u *usbtmc) Clear(ctx context.Context) error {
	done := make(chan error, 1)
	go func() { done <- u.dev.Control(tmcClear, nil) }() // the driver bounds it by the time-out it was given
	select {
	case err := <-done:
		if err != nil {
			return fmt.Errorf("clear the device: %w", err)
		}
	case <-ctx.Done():
		return ended(ctx)
	}
	u.mu.Lock()
	u.owed, u.inside = false, false
	u.mu.Unlock()
	select {
	case <-u.want:
	default:
	}
	return nil
}

// Close ends a wait for a reply and closes the device.
func (u *usbtmc) Close() error {
	u.once.Do(func() { close(u.stop) })
	return u.dev.Close()
}
