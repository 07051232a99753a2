package link_test

import (
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"io"
	"net"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
)

// usb488 is an instrument behind the Linux driver, which keeps the rules of
// message exchange: a message before the reply was read is -410, a read with
// nothing to say is -420 (HP 70004A p. 8-14). Replies come in transfers of
// seven bytes.
type usb488 struct {
	mu     sync.Mutex
	device *scpi.Device
	reply  []byte
	late   time.Duration // of the next reply
	due    time.Time
}

func (u *usb488) Write(b []byte) (int, error) {
	u.mu.Lock()
	defer u.mu.Unlock()
	if u.reply != nil {
		u.device.Push(scpi.NewFault(scpi.QueryInterrupted, ""))
	}
	u.reply = bytes.TrimSuffix(u.device.Execute(context.Background(), bytes.TrimRight(b, "\n")), []byte("\n")) // END alone ends it
	u.due, u.late = time.Now().Add(u.late), 0
	return len(b), nil
}

func (u *usb488) Read(b []byte) (int, error) {
	u.mu.Lock()
	defer u.mu.Unlock()
	if len(u.reply) == 0 || time.Now().Before(u.due) {
		u.device.Push(scpi.NewFault(scpi.QueryUnterminated, ""))
		return 0, syscall.ETIMEDOUT
	}
	n := copy(b[:min(7, len(b))], u.reply)
	if u.reply = u.reply[n:]; len(u.reply) == 0 {
		u.reply = nil
	}
	return n, nil
}

func (u *usb488) Control(request uint, arg []byte) error {
	u.mu.Lock()
	defer u.mu.Unlock()
	switch request {
	case link.TMCClear:
		u.device.Clear()
		u.reply = nil
	case link.TMCReadSTB:
		if arg[0] = 0; len(u.reply) > 0 && !time.Now().Before(u.due) {
			arg[0] = 16
		}
	case link.TMCAttributes:
		if arg[0] = 0; u.reply == nil {
			arg[0] = 1
		}
	}
	return nil
}

func (u *usb488) Close() error { return nil }

// hislip488 is the same instrument behind HiSLIP: replies END and carry the
// number of their question.
type hislip488 struct {
	usb488
	ln net.Listener
	wg sync.WaitGroup
}

func (h *hislip488) serve(c net.Conn) {
	defer c.Close()
	put := func(kind byte, param uint32, payload []byte) {
		b := append([]byte{'H', 'S', kind, 0}, binary.BigEndian.AppendUint32(nil, param)...)
		c.Write(append(binary.BigEndian.AppendUint64(b, uint64(len(payload))), payload...))
	}
	for head := make([]byte, 16); ; {
		if _, err := io.ReadFull(c, head); err != nil {
			return
		}
		payload := make([]byte, binary.BigEndian.Uint64(head[8:]))
		if _, err := io.ReadFull(c, payload); err != nil {
			return
		}
		switch id := binary.BigEndian.Uint32(head[4:]); head[2] {
		case 0:
			put(1, 1<<24|7, nil)
		case 17:
			put(18, 0, nil)
		case 15:
			put(16, 0, binary.BigEndian.AppendUint64(nil, 1<<20))
		case 4:
			c.Write([]byte{'H', 'S', 5, 1, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0})
		case 19:
			h.Control(link.TMCClear, nil)
			put(23, 0, nil)
		case 8:
			put(9, 0, nil)
		case 7:
			h.Write(payload)
			h.wg.Go(func() { h.answer(id, put) })
		}
	}
}

// answer sends the reply when it is due, unless it was cleared meanwhile.
func (h *hislip488) answer(id uint32, put func(byte, uint32, []byte)) {
	h.mu.Lock()
	wait := time.Until(h.due)
	h.mu.Unlock()
	time.Sleep(wait)
	h.mu.Lock()
	reply := h.reply
	h.reply = nil
	h.mu.Unlock()
	if reply != nil {
		put(7, id, reply)
	}
}

func newDevice() *scpi.Device {
	d := scpi.NewDevice("PUMPWORKS,OS-2,0,1.0", 20)
	d.Status.TakeEvents()
	n := 0
	d.Get("READ", func(*scpi.Call) (string, error) { n++; return scpi.NR3(float64(n)), nil })
	d.Get("TRACe", func(*scpi.Call) (string, error) { return scpi.FormatBlock([]byte(strings.Repeat("a\nb", 50))), nil })
	return d
}

// On links that carry messages the whole of scpi works as on a stream: lines,
// blocks with NL inside, queries that are not known, late replies. The
// instrument is never made to complain of the exchange itself.
func TestMessageLinksUnderSCPI(t *testing.T) {
	usb := &usb488{device: newDevice()}
	lan := &hislip488{usb488: usb488{device: newDevice()}}
	var err error
	if lan.ln, err = net.Listen("tcp", "127.0.0.1:0"); err != nil {
		t.Fatal(err)
	}
	lan.wg.Go(func() {
		for {
			c, err := lan.ln.Accept()
			if err != nil {
				return
			}
			lan.wg.Go(func() { lan.serve(c) })
		}
	})
	t.Cleanup(func() { lan.ln.Close(); lan.wg.Wait() })
	for _, c := range []struct {
		name, address string
		dial          link.Dial
		device        *usb488
	}{
		{"USBTMC", "usbtmc:///dev/usbtmc0", func(context.Context, link.Address) (io.ReadWriteCloser, error) { return link.NewUSBTMC(usb) }, usb},
		{"HiSLIP", "hislip://" + lan.ln.Addr().String(), nil, &lan.usb488},
	} {
		t.Run(c.name, func(t *testing.T) {
			a, err := link.Parse(c.address)
			if err != nil {
				t.Fatal(err)
			}
			l, err := link.Open(t.Context(), a, link.Options{Dial: c.dial, Timeout: 400 * time.Millisecond})
			if err != nil {
				t.Fatal(err)
			}
			defer l.Close()
			speaks(t, scpi.New(l, scpi.Options{}), c.device)
		})
	}
}

func speaks(t *testing.T, c *scpi.Conn, u *usb488) {
	ctx := t.Context()
	if id, err := c.Identify(ctx); err != nil || id.Model != "OS-2" {
		t.Fatalf("%+v, %v", id, err)
	}
	reads := func(want string) {
		t.Helper()
		if got, err := c.Query(ctx, "READ?"); err != nil || got != want {
			t.Errorf("READ? %q, %v; want %q", got, err, want)
		}
	}
	reads("+1.00000000E+00")
	if b, err := c.QueryBlock(ctx, "TRAC?", 1000); err != nil || string(b) != strings.Repeat("a\nb", 50) {
		t.Errorf("TRAC? %q, %v", b, err)
	}
	reads("+2.00000000E+00")
	if _, err := c.Query(ctx, "COLOUR?"); !errors.Is(err, link.ErrTimeout) {
		t.Errorf("COLOUR? %v", err)
	}
	if faults, err := c.Errors(ctx); err != nil || len(faults) != 1 || faults[0].Code != scpi.UndefinedHeader {
		t.Errorf("the error queue holds %v, %v; want -113 alone", faults, err)
	}
	u.mu.Lock()
	u.late = time.Second
	u.mu.Unlock()
	if _, err := c.Query(ctx, "READ?"); !errors.Is(err, link.ErrTimeout) {
		t.Errorf("late: %v", err)
	}
	reads("+4.00000000E+00") // never the third, which was late
	if faults, err := c.Errors(ctx); err != nil || len(faults) > 0 {
		t.Errorf("the error queue holds %v, %v", faults, err)
	}
	if err := c.Blind(ctx, "*CLS"); err != nil {
		t.Error(err)
	}
}
