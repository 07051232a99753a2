package bench

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"net"
	"os/exec"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// independent starts the instruments of testdata/independent, which share no
// code with this program, and opens them by the standard dialects.
func independent(t *testing.T) (*Opened, map[string]int) {
	t.Helper()
	node := exec.Command("node", "testdata/independent/instrument.mjs")
	in, err := node.StdinPipe()
	must(t, err)
	out, err := node.StdoutPipe()
	must(t, err)
	if err := node.Start(); err != nil {
		t.Fatalf("%v; Node 20 or newer is needed, 'make setup' sees to it", err)
	}
	t.Cleanup(func() { in.Close(); node.Wait() })
	line, err := bufio.NewReader(out).ReadBytes('\n')
	must(t, err)
	var ports map[string]int
	must(t, json.Unmarshal(line, &ports))
	at := func(name string) string {
		return fmt.Sprintf("tcp://127.0.0.1:%d\"\ndialect = \"standard-%s", ports[name], name)
	}
	text := head + `[supply]
address = "` + at("supply") + `"
max_voltage = "13 V"
max_current = "1 A"
over_voltage = "14 V"
between = ["supply", "common"]
[[meter]]
name = "average"
address = "` + at("meter") + `"
reads = "average_voltage"
between = ["load_hi", "load_lo"]
[scope]
address = "` + at("scope") + `"
earthed = false
[scope.channel.1]
between = ["timer_out", "common"]
probe = 10
`
	f, err := Read(written(t, text))
	must(t, err)
	b, err := Open(t.Context(), f, Options{Clock: instruments.NewClock(1)})
	must(t, err)
	t.Cleanup(func() {
		if err := b.Close(t.Context()); err != nil && t.Context().Err() == nil {
			t.Error(err)
		}
	})
	return b, ports
}

// The supply puts 9 V across 100 Ω, the meter sees half of it, and the scope a
// quarter's duty: what the script says, worked out here by hand.
func TestIndependentInstruments(t *testing.T) {
	b, ports := independent(t)
	ctx := t.Context()
	if id := b.Info[0].Identity; id.Maker != "GROWHOUSE" || b.Practice {
		t.Fatalf("%+v", b.Info[0])
	}
	for _, err := range []error{b.Supply.Protect(ctx, si.Volts(14)), b.Supply.SetCurrentLimit(ctx, si.Amperes(0.5)),
		b.Supply.SetVoltage(ctx, si.Volts(9)), b.Supply.SetOutput(ctx, true)} {
		must(t, err)
	}
	s, err := b.Supply.State(ctx)
	if err != nil || !s.Output || s.Limiting || s.Tripped || s.Voltage.Value != 9 || s.Current.Value != 0.09 {
		t.Errorf("supply %+v, %v", s, err)
	}
	meterReads(t, b.Meters[0], 10, "measured", 4.5)
	meterReads(t, b.Meters[0], 1, "overload", math.NaN())
	independentScope(t, b.Scope)
	independentErrors(t, b.Supply, ports["supply"])
	r := instruments.MakeSafe(ctx, instruments.NewClock(1), b.Bench, instruments.SafeSpec{})
	if !r.Confirmed || r.Voltage == nil || *r.Voltage != 0 {
		t.Errorf("%+v", r)
	}
}

func meterReads(t *testing.T, m instruments.Meter, full float64, outcome instruments.Outcome, volts float64) {
	t.Helper()
	if _, err := m.Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: full, Aperture: 0.02}); err != nil {
		t.Fatal(err)
	}
	s, err := m.Read(t.Context())
	if err != nil || s.Outcome != outcome || s.Value != volts && !math.IsNaN(volts) {
		t.Errorf("meter %+v, %v; want %s %g", s, err, outcome, volts)
	}
}

func independentScope(t *testing.T, s instruments.Scope) {
	t.Helper()
	set := instruments.ScopeSettings{Points: 4000, Duration: 0.02, Channels: []instruments.ScopeChannel{{Number: 1, Low: -2, High: 10, Probe: 10}},
		Trigger: instruments.ScopeTrigger{Channel: 1, Level: 4}}
	_, err := s.Configure(t.Context(), set)
	must(t, err)
	waves, err := s.Capture(t.Context())
	must(t, err)
	w := waves[0]
	high := 0
	for _, c := range w.Codes {
		if v := float64(c)*w.VoltsPerCode + w.VoltsAtZero; math.Abs(v-9) < 0.03 {
			high++
		} else if math.Abs(v) > 0.03 {
			t.Fatalf("the record holds %g V", v)
		}
	}
	if len(w.Codes) != 4000 || math.Abs(float64(high)/4000-0.25) > 0.002 || !w.Triggered || math.Abs(w.Start+0.002) > 1e-9 {
		t.Errorf("%d samples, %d high, triggered %v, from %g s", len(w.Codes), high, w.Triggered, w.Start)
	}
	set.Trigger.Level = 9.5 // never reached
	_, err = s.Configure(t.Context(), set)
	must(t, err)
	if waves, err = s.Capture(t.Context()); err != nil || waves[0].Triggered {
		t.Errorf("without a trigger: %v", err)
	}
}

// Errors: a setting out of range is refused with what the instrument says, and
// its queue overflows as the standard says.
func independentErrors(t *testing.T, supply instruments.Supply, port int) {
	t.Helper()
	wants(t, supply.Protect(t.Context(), si.Volts(99)), driver.ErrRefused, `-222,"Data out of range"`)
	a, err := link.Parse(fmt.Sprintf("tcp://127.0.0.1:%d", port))
	must(t, err)
	l, c, err := Connect(t.Context(), a, nil, Options{Dial: func(ctx context.Context, a link.Address) (io.ReadWriteCloser, error) {
		return (&net.Dialer{}).DialContext(ctx, "tcp", a.Host) // beside the bench's own link, which keeps others of this computer away
	}})
	must(t, err)
	defer l.Close()
	for range 12 {
		must(t, c.Write(t.Context(), "VOLT:COLOUR 5"))
	}
	faults, err := c.Errors(t.Context())
	if err != nil || len(faults) != 10 || faults[0].Code != -113 || !faults[9].Overflow() {
		t.Errorf("%v, %v", faults, err)
	}
	_, err = c.Within(200*time.Millisecond).Query(t.Context(), "VOLT:COLOUR?")
	wants(t, err, link.ErrTimeout)
	if v, err := c.Query(t.Context(), ":sour:voltage:lev?"); err != nil || v != "9.00000000e+0" {
		t.Errorf("the next reply: %q, %v", v, err)
	}
	if _, err := c.Query(t.Context(), "*IDN?;*OPC?"); !isKind(err, scpi.ErrMessage) {
		t.Errorf("two in one: %v", err)
	}
}
