package bench

import (
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/driver"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

func swapped(t *testing.T) {
	w := newWired()
	f := file(t, "192.0.2.10", "192.0.2.11", "192.0.2.11", "192.0.2.10")
	_, err := Open(t.Context(), f, w.options(1))
	wants(t, err, driver.ErrWrong, "supply", "practice-meter", "meter average", "practice-supply", "swapped?")
	reads(t, openedMeter(t, w), 0)
}

func openedMeter(t *testing.T, w *wired) instruments.Meter {
	t.Helper()
	b := opened(t, w, file(t), 1)
	_, err := b.Meters[0].Configure(t.Context(), tenVolts)
	must(t, err)
	return b.Meters[0]
}

func lateReply(t *testing.T) {
	for _, late := range []time.Duration{2100 * time.Millisecond, 4 * time.Second, 9 * time.Second} {
		w, b := metering(t)
		var once sync.Once
		w.meter.Fate = func(m string) (f drivertest.Fate) {
			if m == "READ?" {
				once.Do(func() { f.Delay = late })
			}
			return f
		}
		if _, err := b.Meters[0].Read(t.Context()); err != nil {
			wants(t, err, link.ErrTimeout, "meter average", "READ?")
		}
		w.meter.Input(1.25, 0)
		reads(t, b.Meters[0], 1.25)
		time.Sleep(late) // until the instrument has said what nobody waits for any more
	}
}

func unknownHeader(t *testing.T) {
	w := newWired()
	b := opened(t, w, file(t), 1)
	other := scpi.NewDevice("Nightbench,practice-supply,T1,1.0", 20) // knows no VOLT
	other.Status.TakeEvents()
	w.supply.Device = other
	err := b.Supply.SetVoltage(t.Context(), si.Volts(5))
	wants(t, err, link.ErrTimeout, "VOLT?", "-113", "Undefined header")
	if _, err := b.Supply.Identify(t.Context()); err != nil {
		t.Errorf("the next exchange: %v", err)
	}
}

func everyReplyRead(t *testing.T) {
	c := talking(t, peer(func(line string) string {
		time.Sleep(10 * time.Millisecond)
		return map[string]string{"*IDN?": "GROWHOUSE,DM-1,0,1.0\n", "*OPC?": "1\n"}[line] + strings.TrimSuffix(strings.TrimPrefix(line, "Q"), "?") + "\n"
	}), scpi.Options{NoMarker: true, IdentityQuery: "WHO?"})
	wants(t, c.Write(t.Context(), "READ?"), scpi.ErrMessage, "Write for what has none")
	var all sync.WaitGroup
	for n := range 8 {
		all.Go(func() {
			for range 5 {
				if got, err := c.Query(t.Context(), fmt.Sprintf("Q%d?", n)); err != nil || got != fmt.Sprint(n) {
					t.Errorf("Q%d? is answered %q, %v", n, got, err)
				}
			}
		})
	}
	all.Wait()
}

func terminators(t *testing.T) {
	w, b := metering(t)
	for n, end := range []string{"\r\n", "\n\r", "\n\n", " \r\n", "\x00\n", "\r\r\n"} {
		answering(&w.meter.Listener, "READ?", fmt.Sprintf("+%d.25%s", n, end))
		reads(t, b.Meters[0], float64(n)+0.25)
	}
	answering(&w.meter.Listener, "READ?", "\r\n +7.5\n")
	reads(t, b.Meters[0], 7.5)
	reads(t, b.Meters[0], 4.35)
}

// identified answers as an instrument does that a proof is asked of.
func identified(line string) string {
	return map[string]string{"*IDN?": "GROWHOUSE,DM-1,0,1.0\n", "*OPC?": "1\n", "READ?": "+4.35\n"}[line]
}

func echoes(t *testing.T) {
	echoing := peer(func(line string) string { return line + "\r\n" + identified(line) })
	_, err := talking(t, echoing, scpi.Options{}).Identify(t.Context())
	wants(t, err, scpi.ErrFraming, "echoes")
	told := talking(t, echoing, scpi.Options{Echo: true})
	if got, err := told.Query(t.Context(), "READ?"); err != nil || got != "+4.35" {
		t.Errorf("the next reading: %q, %v", got, err)
	}
}

func wrongBaud(t *testing.T) {
	garbage := peer(func(string) string { return "\xf8\x81\xe0\n" })
	_, err := talking(t, garbage, scpi.Options{}).Identify(t.Context())
	wants(t, err, scpi.ErrFraming, "19200 8N1", "baud rate")
	_, err = talking(t, garbage, scpi.Options{}).Query(t.Context(), "READ?")
	wants(t, err, scpi.ErrOutOfStep)
}

// smallBuffer: an instrument of 100 characters that loses what comes before it
// has done with the message before (HP 34401A User's Guide p. 151, E3632A p. 61).
func smallBuffer(t *testing.T) {
	w, b := metering(t)
	var mu sync.Mutex
	lost := ""
	slow := func(m string) drivertest.Fate {
		mu.Lock()
		defer mu.Unlock()
		if len(m) > 100 {
			lost = m
		}
		return drivertest.Fate{Delay: 5 * time.Millisecond}
	}
	w.meter.Fate, w.scope.Fate = slow, slow
	_, err := b.Meters[0].Configure(t.Context(), tenVolts)
	must(t, err)
	reads(t, b.Meters[0], 4.35)
	_, err = b.Scope.Configure(t.Context(), aScreen)
	must(t, err)
	mu.Lock()
	defer mu.Unlock()
	if lost != "" {
		t.Errorf("%q would have been lost", lost)
	}
	settings := w.meter.Received()
	for n, m := range settings[:len(settings)-1] {
		if strings.HasPrefix(m, "VOLT:DC:RANG ") && settings[n+1] != "VOLT:DC:RANG?" {
			t.Errorf("after %q comes %q, before it is known to be done", m, settings[n+1])
		}
	}
}

func panelLocked(t *testing.T) {
	w := newWired()
	b := opened(t, w, file(t), 1)
	w.supply.Fate = func(m string) (f drivertest.Fate) {
		if f.Drop = m == "OUTP ON"; f.Drop {
			w.supply.Device.Push(scpi.NewFault(-203, m))
		}
		return f
	}
	err := b.Supply.SetOutput(t.Context(), true)
	wants(t, err, driver.ErrRefused, "OUTP ON", "output off when read back", `-203,"Command protected`, "panel unlocked")
	w.supply.Fate = nil
	must(t, b.Supply.SetOutput(t.Context(), true))
}

func turnedAtThePanel(t *testing.T) {
	for _, turn := range []string{"VOLT:DC:RANG 100", "VOLT:DC:NPLC 0.02", `FUNC "CURR:DC"`} {
		w, b := metering(t)
		reads(t, b.Meters[0], 4.35)
		w.meter.Device.Execute(t.Context(), []byte(turn))
		if turn == "VOLT:DC:NPLC 0.02" {
			w.meter.Device.Execute(t.Context(), []byte("VOLT:DC:NPLC 100"))
		}
		_, err := b.Meters[0].Read(t.Context())
		wants(t, err, driver.ErrSettingsLost, "meter average")
		reads(t, b.Meters[0], 4.35)
	}
	w := newWired()
	b := opened(t, w, file(t), 1)
	_, err := b.Scope.Configure(t.Context(), aScreen)
	must(t, err)
	w.scope.Device.Execute(t.Context(), []byte("SENS:SWE:TIME 1"))
	_, err = b.Scope.Capture(t.Context())
	wants(t, err, driver.ErrSettingsLost, "scope")
}

func endlessQueue(t *testing.T) {
	w, b := metering(t)
	w.meter.Fate = func(m string) (f drivertest.Fate) {
		if m == "SYST:ERR?" {
			f.Reply = "-113,\"Undefined header\"\n"
		}
		return f
	}
	before := w.meter.Count("SYST:ERR?")
	_, err := b.Meters[0].Configure(t.Context(), tenVolts)
	wants(t, err, scpi.ErrQueue, "SYST:ERR?")
	if n := w.meter.Count("SYST:ERR?") - before; n > 21 {
		t.Errorf("it was asked %d times, its queue holds 20", n)
	}
	for _, empty := range []string{"0", "+0,\"No error\"", "0 No Error"} {
		if f, more := scpi.ParseFault(empty); more {
			t.Errorf("%q is taken for %v", empty, f)
		}
	}
	w.meter.Fate = nil
	_, err = b.Meters[0].Configure(t.Context(), tenVolts)
	must(t, err)
	reads(t, b.Meters[0], 4.35)
}

func clipped(t *testing.T) {
	w, b := metering(t)
	answering(&w.supply.Listener, "VOLT?", "5.000\n")
	wants(t, b.Supply.SetVoltage(t.Context(), si.Volts(9)), driver.ErrRefused, "VOLT 9", "5\u00a0V when read back")
	answering(&w.meter.Listener, "VOLT:DC:RANG?", "1.0\n")
	_, err := b.Meters[0].Configure(t.Context(), tenVolts)
	wants(t, err, driver.ErrRefused, "a range of 1\u00a0V")
	if _, err := b.Meters[0].Read(t.Context()); !isKind(err, driver.ErrNotConfigured) {
		t.Errorf("the next reading: %v, want it refused", err)
	}
}

func commaAndUnit(t *testing.T) {
	w, b := metering(t)
	for _, reply := range []string{"5,00", "5.00V", "9,9E37", "0x15", "5.00 5.00"} {
		answering(&w.meter.Listener, "READ?", reply+"\n")
		_, err := b.Meters[0].Read(t.Context())
		wants(t, err, scpi.ErrForm, reply)
		reads(t, b.Meters[0], 4.35)
	}
	form := scpi.NumberForm{Units: []string{"V"}}
	if n, err := form.Parse("5.00V"); err != nil || n.Value != 5 {
		t.Errorf("with its unit stated: %+v, %v", n, err)
	}
	if _, err := form.Parse("5,00V"); err == nil {
		t.Error("a comma passed for a point")
	}
}

func replyHeader(t *testing.T) {
	w, b := metering(t)
	answering(&w.meter.Listener, "READ?", ":READ +4.35E+00\n")
	_, err := b.Meters[0].Read(t.Context())
	wants(t, err, scpi.ErrForm, ":READ +4.35E+00")
	reads(t, b.Meters[0], 4.35)
	answering(&w.supply.Listener, "OUTP?", "OUTP 1\n")
	_, err = b.Supply.State(t.Context())
	wants(t, err, scpi.ErrForm, "OUTP 1")

	stated := own(t, "standard-meter", `read = { ask = "READ?",`, `read = { ask = "READ?", prefix = [":READ "],`)
	m, listener := meterIn(t, stated)
	for _, reply := range []string{":READ +4.35E+00\n", "+4.35E+00\n"} {
		answering(listener, "READ?", reply)
		reads(t, m, 4.35)
	}
}

// slowParser drops what comes less than 100 ms after the message before (GW
// Instek GPD-3303 pp. 41-42 asks for 70 to 400 ms).
func slowParser(t *testing.T) {
	var last time.Time
	dropped := 0
	c := talking(t, peer(func(line string) string {
		defer func() { last = time.Now() }()
		if time.Since(last) < 100*time.Millisecond {
			dropped++
			return ""
		}
		return identified(line)
	}), scpi.Options{Gap: 100 * time.Millisecond})
	for range 5 {
		must(t, c.Write(t.Context(), "VOLT 5"))
		if got, err := c.Query(t.Context(), "READ?"); err != nil || got != "+4.35" {
			t.Errorf("got %q, %v", got, err)
		}
	}
	if dropped > 0 {
		t.Errorf("%d messages were dropped", dropped)
	}
	m, listener := meterIn(t, own(t, "standard-meter", "[link]\n", "[link]\ngap = \"100 ms\"\nsource = \"ours\"\n"))
	listener.Fate = func(string) drivertest.Fate {
		defer func() { last = time.Now() }()
		return drivertest.Fate{Drop: time.Since(last) < 100*time.Millisecond}
	}
	for range 3 {
		reads(t, m, 4.35)
	}
}
