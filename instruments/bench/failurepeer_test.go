package bench

import (
	"bufio"
	"context"
	"io"
	"net"
	"strings"
	"sync"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// wants fails unless err is of a kind and its words hold all the parts.
func wants(t *testing.T, err, kind error, parts ...string) {
	t.Helper()
	if !isKind(err, kind) {
		t.Fatalf("got %v, want %q", err, kind)
	}
	for _, p := range parts {
		if !strings.Contains(err.Error(), p) {
			t.Errorf("%q does not say %q", err, p)
		}
	}
}

func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

var tenVolts = instruments.MeterSettings{Unit: si.Volt, Range: 10, Aperture: 0.02}

// metering is a bench whose meter is set up and sees 4.35 V.
func metering(t *testing.T) (*wired, *Opened) {
	t.Helper()
	w := newWired()
	b := opened(t, w, file(t), 1)
	_, err := b.Meters[0].Configure(t.Context(), tenVolts)
	must(t, err)
	w.meter.Input(4.35, 0)
	return w, b
}

// reads holds the next reading to its value. When the settings are doubted it
// may be refused, and is right after they were made anew.
func reads(t *testing.T, m instruments.Meter, want float64) {
	t.Helper()
	s, err := m.Read(t.Context())
	if isKind(err, driver.ErrSettingsLost) || isKind(err, driver.ErrNotConfigured) {
		_, err = m.Configure(t.Context(), tenVolts)
		must(t, err)
		s, err = m.Read(t.Context())
	}
	if err != nil || s.Outcome != instruments.Measured || s.Value != want {
		t.Errorf("the next reading: %+v, %v; want %g V", s, err, want)
	}
}

// answering replaces the reply to one message, once.
func answering(l *drivertest.Listener, message, reply string) {
	var once sync.Once
	l.Fate = func(m string) (f drivertest.Fate) {
		if m == message {
			once.Do(func() { f.Reply = reply })
		}
		return f
	}
}

// peer is an instrument that answers line by line; an empty answer is none.
func peer(answer func(line string) string) link.Dial {
	return func(context.Context, link.Address) (io.ReadWriteCloser, error) {
		near, far := net.Pipe()
		go func() {
			defer far.Close()
			for in := bufio.NewScanner(far); in.Scan(); {
				if _, err := io.WriteString(far, answer(in.Text())); err != nil {
					return
				}
			}
		}()
		return near, nil
	}
}

// talking is a connection to a peer.
func talking(t *testing.T, dial link.Dial, o scpi.Options) *scpi.Conn {
	t.Helper()
	a, err := link.Parse("serial:///dev/ttyS77?baud=19200")
	must(t, err)
	l, err := link.Open(t.Context(), a, link.Options{Dial: dial, Timeout: time.Second})
	must(t, err)
	t.Cleanup(func() { l.Close() })
	return scpi.New(l, o)
}

// own is a standard dialect with changes made to its file.
func own(t *testing.T, name string, changes ...string) *dialect.Dialect {
	t.Helper()
	all, err := dialect.All()
	must(t, err)
	for _, d := range all {
		if d.Head.Name != name {
			continue
		}
		text := strings.NewReplacer(changes...).Replace(d.Text)
		if text == d.Text {
			t.Fatalf("%s holds none of %q", name, changes)
		}
		d, err := dialect.Parse("own.toml", []byte(text))
		must(t, err)
		return d
	}
	t.Fatalf("no dialect %s", name)
	return nil
}

// meterIn opens a meter that sees 4.35 V in a dialect.
func meterIn(t *testing.T, d *dialect.Dialect) (instruments.Meter, *drivertest.Listener) {
	t.Helper()
	peer := drivertest.NewMeter()
	a, err := link.Parse("tcp://192.0.2.11:5025")
	must(t, err)
	l, conn, err := Connect(t.Context(), a, d, Options{Dial: peer.Dial})
	must(t, err)
	t.Cleanup(func() { l.Close() })
	m, _, err := driver.OpenMeter(t.Context(), conn, d, driver.MeterOptions{Options: driver.Options{Name: "meter", Clock: instruments.NewClock(1)}})
	must(t, err)
	_, err = m.Configure(t.Context(), tenVolts)
	must(t, err)
	peer.Input(4.35, 0)
	return m, &peer.Listener
}
