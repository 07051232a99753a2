package link

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/creack/pty"
)

// onPty opens a pseudo-terminal and gives the address of its device and the
// instrument's end.
func onPty(t *testing.T, query string) (Address, *os.File) {
	t.Helper()
	master, slave, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { master.Close(); slave.Close() })
	a, err := Parse("serial://" + slave.Name() + query)
	if err != nil {
		t.Fatal(err)
	}
	return a, master
}

func TestPtyQuery(t *testing.T) {
	for _, query := range []string{"", "?baud=115200&flow=xonxoff", "?baud=250000&bits=7&parity=even&stop=2&flow=rtscts"} {
		a, far := onPty(t, query)
		l, err := Open(t.Context(), a, Options{})
		if err != nil {
			t.Fatalf("%s: %v", a, err)
		}
		go func() {
			b := make([]byte, 6)
			io.ReadFull(far, b)
			far.WriteString("got " + string(b[:5]) + "\r\n")
		}()
		if got, err := l.Query(t.Context(), "*IDN?"); err != nil || got != "got *IDN?" {
			t.Errorf("%s: %q, %v", a, got, err)
		}
		if err := l.Close(); err != nil {
			t.Error(err)
		}
	}
}

// The line must be raw: no byte may be translated, swallowed or echoed.
func TestPtyIsRaw(t *testing.T) {
	a, far := onPty(t, "")
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	all := make([]byte, 256)
	for i := range all {
		all[i] = byte(i)
	}
	go far.Write(all)
	turn, err := l.Acquire(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer turn.Release()
	if got, err := turn.ReadFull(t.Context(), 256); err != nil || string(got) != string(all) {
		t.Errorf("got %d bytes %q, %v", len(got), got, err)
	}
}

func TestPtyCloseDuringARead(t *testing.T) {
	a, far := onPty(t, "")
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	result := make(chan error, 1)
	go func() { _, err := l.Query(t.Context(), "A?"); result <- err }()
	if _, err := io.ReadFull(far, make([]byte, 3)); err != nil {
		t.Fatal(err)
	}
	if err := l.Close(); err != nil {
		t.Error(err)
	}
	if err := <-result; !errors.Is(err, ErrClosed) {
		t.Errorf("read: %v, want ErrClosed", err)
	}
}

// A pseudo-terminal nobody reads takes a few kilobytes and then blocks, as a
// serial line does whose flow control says stop.
func TestPtyBlockedWrite(t *testing.T) {
	a, _ := onPty(t, "")
	l, err := Open(t.Context(), a, Options{WriteTimeout: 100 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Send(t.Context(), strings.Repeat("x", 1<<20)); !errors.Is(err, ErrTimeout) {
		t.Errorf("send: %v, want ErrTimeout", err)
	}
	if err := l.Reopen(t.Context()); err != nil {
		t.Errorf("reopen: %v", err)
	}
	if err := l.Close(); err != nil {
		t.Errorf("close: %v", err)
	}
}

func TestPtyUnplugged(t *testing.T) {
	master, slave, err := pty.Open()
	if err != nil {
		t.Fatal(err)
	}
	a, err := Parse("serial://" + slave.Name())
	if err != nil {
		t.Fatal(err)
	}
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	slave.Close()
	master.Close()
	if _, err := l.Query(t.Context(), "A?"); !errors.Is(err, ErrLost) {
		t.Errorf("unplugged: %v, want ErrLost", err)
	}
	if err := l.Reopen(t.Context()); err == nil || errors.Is(err, ErrLost) {
		t.Errorf("reopen without a device: %v", err)
	}
	if _, err := l.Query(t.Context(), "A?"); !errors.Is(err, ErrLost) {
		t.Errorf("still unplugged: %v, want ErrLost", err)
	}
}

func TestSerialRefuses(t *testing.T) {
	a, _ := onPty(t, "")
	l, err := Open(t.Context(), a, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if _, err := Open(t.Context(), a, Options{}); !errors.Is(err, ErrBusy) {
		t.Errorf("second opening: %v, want ErrBusy", err)
	}
	for path, kind := range map[string]error{
		filepath.Join(t.TempDir(), "ttyUSB9"): ErrMissing,
		"/dev/null":                           nil,
	} {
		a, err := Parse("serial://" + path)
		if err != nil {
			t.Fatal(err)
		}
		_, err = Open(t.Context(), a, Options{})
		if err == nil || kind != nil && !errors.Is(err, kind) {
			t.Errorf("%s: %v, want %v", path, err, kind)
		}
	}
}
