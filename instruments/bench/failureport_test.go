package bench

import (
	"bufio"
	"context"
	"net"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
	"nightbench/instruments/practice"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// plugged is a practice bench on pseudo-terminals under names that stay, or on
// TCP, and its instruments opened.
type plugged struct {
	*Opened
	practice *practice.Bench
	names    string // folder of the names that stay
	clock    instruments.Clock
}

func plugIn(t *testing.T, tcp bool) *plugged {
	t.Helper()
	p := &plugged{clock: instruments.NewClock(20), names: t.TempDir()}
	var err error
	p.practice, err = practice.New(clocked(p.clock))
	must(t, err)
	t.Cleanup(func() { p.practice.Close() })
	changes := []string{"practice = true", "practice = true\npace = 20"}
	for n, i := range p.practice.Instruments() {
		var address string
		if tcp {
			address, err = i.ServeTCP(t.Context(), "127.0.0.1:0")
		} else {
			address, err = i.ServePTYAs(filepath.Join(p.names, i.Name))
		}
		must(t, err)
		changes = append(changes, "tcp://192.0.2.1"+strconv.Itoa(n)+":5025", address)
	}
	p.Opened, err = Open(t.Context(), file(t, changes...), Options{Clock: p.clock})
	must(t, err)
	t.Cleanup(func() {
		ctx, cancel := context.WithTimeout(context.Background(), 2*time.Second)
		defer cancel()
		p.Close(ctx) // a port may be gone: what it says is of no use here
	})
	must(t, p.Supply.Protect(t.Context(), si.Volts(14)))
	must(t, p.Supply.SetCurrentLimit(t.Context(), si.Amperes(0.5)))
	must(t, p.Supply.SetVoltage(t.Context(), si.Volts(8)))
	must(t, p.Supply.SetOutput(t.Context(), true))
	_, err = p.Meters[0].Configure(t.Context(), tenVolts)
	must(t, err)
	must(t, p.clock.Sleep(t.Context(), time.Second))
	return p
}

// rightOrRefused takes readings until one is given; it must be right. A quarter
// of 8 V is what the meter sees; its aperture is 20 periods of the clocked board.
func (p *plugged) rightOrRefused(t *testing.T) {
	t.Helper()
	for range 5 {
		s, err := p.Meters[0].Read(t.Context())
		if err == nil {
			agrees(t, "the next reading", s.Value, 2, 20e-3)
			return
		}
		if isKind(err, driver.ErrSettingsLost) || isKind(err, driver.ErrNotConfigured) {
			if _, err := p.Meters[0].Configure(t.Context(), tenVolts); err != nil {
				t.Logf("refused: %v", err)
			}
		}
	}
	t.Error("never again a reading")
}

func unplugged(t *testing.T) {
	p := plugIn(t, false)
	must(t, p.practice.Inject(practice.Fault{Kind: practice.Unplugged, On: "average"}))
	_, err := p.Meters[0].Read(t.Context())
	wants(t, err, link.ErrLost, "meter average", "check cable and power")
	_, err = p.Meters[0].Read(t.Context())
	wants(t, err, link.ErrMissing, "is it plugged in")
	p.practice.Lift(practice.Unplugged, "average")
	p.rightOrRefused(t)

	must(t, p.practice.Inject(practice.Fault{Kind: practice.Unplugged, On: "supply"}))
	if err := p.Supply.SetVoltage(t.Context(), si.Volts(9)); !isKind(err, link.ErrLost) {
		t.Errorf("a setting on a lost link: %v", err)
	}
	p.practice.Lift(practice.Unplugged, "supply")
	if s, err := p.Supply.State(t.Context()); err != nil || s.Voltage.Value > 8.1 {
		t.Errorf("the setting was repeated after the loss: %+v, %v", s, err)
	}
}

func renumbered(t *testing.T) {
	p := plugIn(t, false)
	name := filepath.Join(p.names, "average")
	before, err := os.Readlink(name)
	must(t, err)
	must(t, p.practice.Inject(practice.Fault{Kind: practice.Unplugged, On: "average"}))
	p.practice.Lift(practice.Unplugged, "average")
	after, err := os.Readlink(name)
	must(t, err)
	if before == after {
		t.Fatalf("it is %s again", after)
	}
	if _, err := p.Meters[0].Read(t.Context()); err != nil {
		wants(t, err, link.ErrLost)
	}
	p.rightOrRefused(t)
	must(t, os.Symlink(after, filepath.Join(p.names, "ttyUSB1"))) // as the system numbers them
	a, err := link.Parse("serial://" + filepath.Join(p.names, "ttyUSB0"))
	must(t, err)
	_, err = link.Open(t.Context(), a, link.Options{})
	wants(t, err, link.ErrMissing, "its number changes when it is plugged in again: use the name that stays", "there are: "+p.names+"/ttyUSB1")

	// Another instrument under the name that was: refused by who it is.
	must(t, p.practice.Inject(practice.Fault{Kind: practice.Unplugged, On: "average"}))
	must(t, p.practice.Inject(practice.Fault{Kind: practice.Unplugged, On: "pot"}))
	p.practice.Lift(practice.Unplugged, "pot")
	other, err := os.Readlink(filepath.Join(p.names, "pot"))
	must(t, err)
	must(t, os.Symlink(other, name))
	p.Pot.Code(t.Context()) // notices its own loss, and lets go of nothing new
	for range 2 {
		if s, err := p.Meters[0].Read(t.Context()); err == nil {
			t.Errorf("another instrument's reply was taken for a reading: %+v", s)
		}
	}
}

func newlineInBlock(t *testing.T) {
	p := plugIn(t, false)
	set := instruments.ScopeSettings{Points: 2000, Duration: 0.02, Channels: []instruments.ScopeChannel{{Number: 1, Low: -10, High: 10, Probe: 10}},
		Trigger: instruments.ScopeTrigger{Channel: 1, Level: 4}}
	_, err := p.Scope.Configure(t.Context(), set)
	must(t, err)
	waves, err := p.Scope.Capture(t.Context())
	must(t, err)
	w := waves[0]
	newlines := 0
	for _, c := range w.Codes {
		if c&0xff == '\n' || c>>8&0xff == '\n' {
			newlines++
		}
	}
	levels := map[bool]int{}
	for _, c := range w.Codes {
		levels[float64(c)*w.VoltsPerCode+w.VoltsAtZero > 4]++
	}
	if len(w.Codes) != set.Points {
		t.Errorf("%d samples", len(w.Codes))
	}
	agrees(t, "share of time at the low level", float64(levels[false])/float64(len(w.Codes)), 0.25, 5e-3)
	c := talking(t, peer(func(line string) string {
		if line == "TRAC?" {
			return "#16\n\r\n\x00\n\n\n"
		}
		return identified(line)
	}), scpi.Options{})
	if b, err := c.QueryBlock(t.Context(), "TRAC?", 100); err != nil || string(b) != "\n\r\n\x00\n\n" {
		t.Errorf("%q, %v", b, err)
	}
	if got, err := c.Query(t.Context(), "READ?"); err != nil || got != "+4.35" {
		t.Errorf("the next reading: %q, %v", got, err)
	}
	a, err := link.Parse("serial:///dev/ttyS77?flow=xonxoff")
	must(t, err)
	l, err := link.Open(t.Context(), a, link.Options{Dial: peer(identified)})
	must(t, err)
	defer l.Close()
	_, err = scpi.New(l, scpi.Options{}).QueryBlock(t.Context(), "TRAC?", 100)
	wants(t, err, scpi.ErrMessage, "flow=xonxoff")
}

func queueFull(t *testing.T) {
	p := plugIn(t, true)
	must(t, p.practice.Inject(practice.Fault{Kind: practice.QueueFull, On: "average"}))
	_, err := p.Meters[0].Configure(t.Context(), tenVolts)
	wants(t, err, driver.ErrComplained, "-350", "Queue overflow")
	p.rightOrRefused(t)
}

func tripped(t *testing.T) {
	p := plugIn(t, true)
	must(t, p.practice.Inject(practice.Fault{Kind: practice.Tripped, On: "supply"}))
	must(t, p.clock.Sleep(t.Context(), 30*time.Second)) // the board's capacitors run down
	s, err := p.Supply.State(t.Context())
	if err != nil || !s.Tripped || s.Output || s.Voltage.Value > 0.5 {
		t.Errorf("%+v, %v", s, err)
	}
	wants(t, p.Supply.SetOutput(t.Context(), true), driver.ErrTripped, "find out why before clearing it")
	if s, err := p.Supply.State(t.Context()); err != nil || !s.Tripped || s.Output {
		t.Errorf("after asking for on: %+v, %v", s, err)
	}
}

func otherClient(t *testing.T) {
	p := plugIn(t, true)
	for _, says := range []string{"*IDN?", "READ?", "*OPC?"} {
		must(t, p.practice.Inject(practice.Fault{Kind: practice.Intruder, On: "average", Says: says, Times: 1}))
		p.Meters[0].Read(t.Context()) // refused, or right by luck
		must(t, p.Supply.SetVoltage(t.Context(), si.Volts(8)))
		p.rightOrRefused(t)
	}
	mine, err := link.Parse(p.Info[0].Address)
	must(t, err)
	_, err = link.Open(t.Context(), mine, link.Options{})
	wants(t, err, link.ErrBusy, "on this computer")
	serial := plugIn(t, false)
	a, err := link.Parse("serial://" + filepath.Join(serial.names, "supply"))
	must(t, err)
	_, err = link.Open(t.Context(), a, link.Options{})
	wants(t, err, link.ErrBusy, "this program itself has it open")
}

func powerCycle(t *testing.T) {
	p := plugIn(t, true)
	must(t, p.practice.Inject(practice.Fault{Kind: practice.PowerDip, On: "average"}))
	ctx, cancel := context.WithTimeout(t.Context(), 300*time.Millisecond)
	defer cancel()
	_, err := p.Meters[0].Read(ctx)
	wants(t, err, link.ErrTimeout, "meter average")
	p.practice.Lift(practice.PowerDip, "average")
	_, err = p.Meters[0].Read(t.Context())
	if err == nil || !isKind(err, driver.ErrSettingsLost) || !strings.Contains(err.Error(), "switched off and on?") {
		t.Errorf("the reading after it: %v, want it refused", err)
	}
	p.rightOrRefused(t)
}

// splitPackets: a reply in single bytes, and two messages in one packet, on a real socket.
func splitPackets(t *testing.T) {
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	must(t, err)
	done := make(chan struct{})
	go func() {
		defer close(done)
		c, err := ln.Accept()
		if err != nil {
			return
		}
		defer c.Close()
		for in := bufio.NewScanner(c); in.Scan(); {
			for _, b := range []byte(identified(in.Text())) {
				c.Write([]byte{b})
				time.Sleep(time.Millisecond)
			}
		}
	}()
	defer func() { ln.Close(); <-done }()
	a, err := link.Parse("tcp://" + ln.Addr().String())
	must(t, err)
	l, err := link.Open(t.Context(), a, link.Options{})
	must(t, err)
	defer l.Close()
	c := scpi.New(l, scpi.Options{})
	for range 3 {
		if got, err := c.Query(t.Context(), "READ?"); err != nil || got != "+4.35" {
			t.Errorf("got %q, %v", got, err)
		}
	}
	turn, err := l.Acquire(t.Context())
	must(t, err)
	defer turn.Release()
	must(t, turn.Send(t.Context(), "READ?\n*OPC?"))
	var got []string
	for range 2 {
		line, err := turn.ReadLine(t.Context())
		must(t, err)
		got = append(got, line)
	}
	if !slices.Equal(got, []string{"+4.35", "1"}) {
		t.Errorf("got %q", got)
	}
}
