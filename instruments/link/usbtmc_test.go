package link

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"
)

// tmcCalls is a device file that follows a record of calls and refuses others.
// A line is a call and what came of it:
//
//	w "*IDN?\n"              a write
//	r "text" or r timeout    a read
//	c 5b02 [01] = 10         an ioctl: request, argument in, argument out (hexadecimal) or an errno
type tmcCalls struct {
	t    *testing.T
	mu   sync.Mutex
	want []string
}

func record(t *testing.T, text string) *tmcCalls {
	c := &tmcCalls{t: t}
	for line := range strings.Lines(text) {
		if line = strings.TrimSpace(line); line != "" && line[0] != '#' {
			c.want = append(c.want, line)
		}
	}
	t.Cleanup(func() {
		if len(c.want) > 0 {
			t.Errorf("calls that never came: %q", c.want)
		}
	})
	return c
}

// next takes the next line, which has to begin so. A look at the status byte
// that is not in the record finds no reply there.
func (c *tmcCalls) next(call string) (result string) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if len(c.want) > 0 {
		if rest, ok := strings.CutPrefix(c.want[0], call); ok {
			c.want = c.want[1:]
			return strings.TrimPrefix(rest, " = ")
		}
	}
	if call == fmt.Sprintf("c %x", tmcReadSTB) {
		return "00"
	}
	c.t.Errorf("call %s, want %q", call, c.want)
	return "EIO"
}

var errnos = map[string]error{"ETIMEDOUT": syscall.ETIMEDOUT, "ENODEV": syscall.ENODEV, "ENOTTY": syscall.ENOTTY, "EIO": syscall.EIO}

func (c *tmcCalls) Read(b []byte) (int, error) {
	result := c.next("r")
	result = strings.TrimSpace(result)
	if err, ok := errnos[result]; ok {
		return 0, err
	}
	var text string
	if _, err := fmt.Sscanf(result, "%q", &text); err != nil {
		c.t.Errorf("record %q: %v", result, err)
	}
	return copy(b, text), nil
}

func (c *tmcCalls) Write(b []byte) (int, error) {
	if err, ok := errnos[c.next(fmt.Sprintf("w %q", b))]; ok {
		return 0, err
	}
	return len(b), nil
}

func (c *tmcCalls) Control(request uint, arg []byte) error {
	call := fmt.Sprintf("c %x", request)
	if len(arg) > 0 && request>>30 == 1 { // the argument goes in
		call += fmt.Sprintf(" %x", arg)
	}
	result := c.next(call)
	if err, ok := errnos[result]; ok {
		return err
	}
	if len(arg) > 0 && request>>30 == 2 {
		var v byte
		if _, err := fmt.Sscanf(result, "%x", &v); err != nil {
			c.t.Errorf("record of %s: %q: %v", call, result, err)
		}
		arg[0] = v
	}
	return nil
}

func (c *tmcCalls) Close() error { return nil }

// onUSB opens a link on a record of calls.
func onUSB(t *testing.T, timeout time.Duration, text string) *Link {
	t.Helper()
	return onCalls(t, timeout, record(t, text))
}

func onCalls(t *testing.T, timeout time.Duration, calls *tmcCalls) *Link {
	t.Helper()
	a, err := Parse("usbtmc:///dev/usbtmc0")
	if err != nil {
		t.Fatal(err)
	}
	l, err := Open(t.Context(), a, Options{Timeout: timeout, Dial: func(context.Context, Address) (io.ReadWriteCloser, error) {
		return newUSBTMC(calls)
	}})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l
}

// timeout is the argument of a time-out of so many milliseconds.
func timeout(ms uint32) string {
	return fmt.Sprintf("c 40045b0a %x\n", binary.NativeEndian.AppendUint32(nil, ms))
}

// with488 is the opening of a device that has a status byte.
const with488 = "c 40025b0c 0a00\nc 40015b0b 01\nc 80015b11 = 07\nc 80015b12 = 00\n"

// The numbers of the requests, from the way the kernel builds them (asm-generic
// ioctl.h: direction, size, type 91, number) and the names in linux/usb/tmc.h.
func TestUSBTMCRequestNumbers(t *testing.T) {
	const none, write, read = 0, 1, 2
	number := func(direction, size, n uint) uint { return direction<<30 | size<<16 | 91<<8 | n }
	for name, c := range map[string][2]uint{
		"CLEAR": {tmcClear, number(none, 0, 2)}, "SET_TIMEOUT": {tmcSetTimeout, number(write, 4, 10)},
		"EOM_ENABLE": {tmcEOMEnable, number(write, 1, 11)}, "CONFIG_TERMCHAR": {tmcTermChar, number(write, 2, 12)},
		"488_GET_CAPS": {tmcGetCaps, number(read, 1, 17)}, "488_READ_STB": {tmcReadSTB, number(read, 1, 18)},
		"MSG_IN_ATTR": {tmcAttributes, number(read, 1, 24)},
	} {
		if c[0] != c[1] {
			t.Errorf("%s: %#x, want %#x", name, c[0], c[1])
		}
	}
}

func TestUSBTMCQuery(t *testing.T) {
	l := onUSB(t, time.Second, with488+`
		w "*IDN?\n"
		c 80015b12 = 10
		`+timeout(1000)+`
		r "GROWHOUSE,DM-1,0,1.0"
		c 80015b18 = 01
	`)
	if got, err := l.Query(t.Context(), "*IDN?"); err != nil || got != "GROWHOUSE,DM-1,0,1.0" {
		t.Errorf("got %q, %v", got, err)
	}
}

// A block of three transfers: only the last carries END, and a device without
// USB488 has no status byte. Nothing is read beyond.
func TestUSBTMCBlockInParts(t *testing.T) {
	l := onUSB(t, time.Second, "c 40025b0c 0a00\nc 40015b0b 01\nc 80015b11 = ENOTTY\n"+`
		w "TRAC?\n"
		`+timeout(1000)+`
		r "#16ab"
		c 80015b18 = 00
		`+timeout(1000)+`
		r "\ncd"
		c 80015b18 = 00
		`+timeout(1000)+`
		r "e\n"
		c 80015b18 = 01
	`)
	turn, err := l.Acquire(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer turn.Release()
	if err := turn.Send(t.Context(), "TRAC?"); err != nil {
		t.Fatal(err)
	}
	if got, err := turn.ReadFull(t.Context(), 9); err != nil || string(got) != "#16ab\ncde" {
		t.Errorf("got %q, %v", got, err)
	}
	if more, err := turn.Listen(t.Context(), 20*time.Millisecond); err != nil || len(more) > 0 {
		t.Errorf("then %q, %v", more, err)
	}
}

// A reply that does not come: the driver clears the device, and the next reply
// is the next question's.
func TestUSBTMCTimeoutThenClear(t *testing.T) {
	l := onUSB(t, 50*time.Millisecond, "c 40025b0c 0a00\nc 40015b0b 01\nc 80015b11 = ENOTTY\n"+`
		w "READ?\n"
		`+timeout(50)+`
		r ETIMEDOUT
		c 5b02
		w "*IDN?\n"
		`+timeout(50)+`
		r "GROWHOUSE,DM-1,0,1.0\n"
		c 80015b18 = 01
	`)
	if _, err := l.Query(t.Context(), "READ?"); !errors.Is(err, ErrTimeout) {
		t.Errorf("got %v, want ErrTimeout", err)
	}
	if got, err := l.Query(t.Context(), "*IDN?"); err != nil || got != "GROWHOUSE,DM-1,0,1.0" {
		t.Errorf("got %q, %v", got, err)
	}
}

// A line sent blind goes out while a reply is awaited, since waiting is done by
// looking at the status byte and holds no read in the driver.
func TestUSBTMCBlindWhileWaiting(t *testing.T) {
	calls := record(t, with488+`
		w "READ?\n"
		w "OUTP OFF\n"
	`)
	l := onCalls(t, 500*time.Millisecond, calls)
	result := make(chan error, 1)
	go func() { _, err := l.Query(t.Context(), "READ?"); result <- err }()
	for left := 2; left == 2; time.Sleep(time.Millisecond) { // until READ? is written
		calls.mu.Lock()
		left = len(calls.want)
		calls.mu.Unlock()
	}
	if between, err := l.Blind(t.Context(), "OUTP OFF"); err != nil || !between {
		t.Errorf("blind: in between %v, %v", between, err)
	}
	if err := <-result; !errors.Is(err, ErrTimeout) {
		t.Errorf("the query: %v", err)
	}
}

func TestUSBTMCUnplugged(t *testing.T) {
	l := onUSB(t, time.Second, with488+"w \"READ?\\n\"\nc 80015b12 = ENODEV\n")
	if _, err := l.Query(t.Context(), "READ?"); !errors.Is(err, ErrLost) || !errors.Is(err, syscall.ENODEV) {
		t.Errorf("got %v, want ErrLost", err)
	}
}

func TestUSBTMCOldDriverIsRefused(t *testing.T) {
	if _, err := newUSBTMC(record(t, "c 40025b0c 0a00 = ENOTTY")); err == nil || !strings.Contains(err.Error(), "Linux 4.20") {
		t.Errorf("got %v", err)
	}
}

func TestUSBTMCNotThere(t *testing.T) {
	for text, kind := range map[string]error{"usbtmc:///dev/usbtmc97": ErrMissing, "usbtmc://dead-beef/1": ErrMissing, "usbtmc:///dev/null": nil} {
		a, err := Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		if _, err = Open(t.Context(), a, Options{}); err == nil || kind != nil && !errors.Is(err, kind) {
			t.Errorf("%s: %v, want %v", text, err, kind)
		}
	}
}
