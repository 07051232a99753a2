package bench

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/driver"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

func isKind(err, kind error) bool { return errors.Is(err, kind) }

// aScreen is a set-up of the scope: 40 mV a code, so that 0.4 V is code 10, an NL byte.
var aScreen = instruments.ScopeSettings{Points: 200, Duration: 0.01, Channels: []instruments.ScopeChannel{{Number: 1, Low: -5, High: 5, Probe: 10}},
	Trigger: instruments.ScopeTrigger{Channel: 1, Level: 0.1}}

// scoping is a bench whose scope is set up and sees a steady 0.4 V.
func scoping(t *testing.T) (*wired, *Opened) {
	t.Helper()
	w := newWired()
	w.scope.Signal = func(int, float64) float64 { return 0.4 }
	b := opened(t, w, file(t), 1)
	_, err := b.Scope.Configure(t.Context(), aScreen)
	must(t, err)
	return w, b
}

// records holds the next record to a steady voltage.
func records(t *testing.T, s instruments.Scope, want float64) {
	t.Helper()
	waves, err := s.Capture(t.Context())
	must(t, err)
	w := waves[0]
	if len(w.Codes) != aScreen.Points {
		t.Errorf("%d samples, want %d", len(w.Codes), aScreen.Points)
	}
	for _, c := range w.Codes {
		if v := float64(c)*w.VoltsPerCode + w.VoltsAtZero; math.Abs(v-want) > w.VoltsPerCode/2 {
			t.Fatalf("the next record holds %g V, want %g V", v, want)
		}
	}
}

func truncatedBlock(t *testing.T) {
	for _, cut := range []int{2, 3, 10, 300, 403} { // of #3400 and 400 bytes
		w, b := scoping(t)
		answering(&w.scope.Listener, "TRAC? CH1", ("#3400" + strings.Repeat("\x00\x0a", 200))[:cut])
		_, err := b.Scope.Capture(t.Context())
		wants(t, err, link.ErrTimeout, "scope", "TRAC? CH1")
		if cut > 5 {
			wants(t, err, scpi.ErrFraming, fmt.Sprintf("got %d of 400 bytes", cut-5))
		}
		records(t, b.Scope, 0.4)
	}
}

func wrongCount(t *testing.T) {
	body := strings.Repeat("\x00\x0a", 200)
	for name, reply := range map[string]string{
		"TooLow": "#3398" + body + "\n", "TooHigh": "#3402" + body + "\n", "NoHash": "3400" + body + "\n",
		"NoCount": "#" + body + "\n", "Huge": "#9999999999" + body + "\n", "Indefinite": "#0" + body + "\n", "Text": "+4.35E+00\n",
	} {
		w, b := scoping(t)
		answering(&w.scope.Listener, "TRAC? CH1", reply)
		if _, err := b.Scope.Capture(t.Context()); err == nil {
			t.Errorf("%s: the record was used", name)
		}
		records(t, b.Scope, 0.4)
	}
	w, b := scoping(t)
	w.scope.Mangled = true // a sample short, and the count says so
	_, err := b.Scope.Capture(t.Context())
	wants(t, err, driver.ErrReply, "199 samples", "200 were asked for")
}

func limiting(t *testing.T) {
	w := newWired()
	w.supply.Load = 1
	b := opened(t, w, file(t), 1)
	must(t, b.Supply.SetCurrentLimit(t.Context(), si.Amperes(0.5)))
	must(t, b.Supply.SetVoltage(t.Context(), si.Volts(9)))
	must(t, b.Supply.SetOutput(t.Context(), true))
	s, err := b.Supply.State(t.Context())
	if err != nil || !s.Limiting || s.Tripped || s.Voltage.Value != 0.5 || s.Current.Value != 0.5 {
		t.Errorf("%+v, %v", s, err)
	}
}

func overload(t *testing.T) {
	w, b := metering(t)
	for _, v := range []float64{25, -25} {
		w.meter.Input(v, 0)
		s, err := b.Meters[0].Read(t.Context())
		if err != nil || s.Outcome != instruments.Overload || !math.IsNaN(s.Value) {
			t.Errorf("%+v, %v", s, err)
		}
	}
	w.meter.Input(4.35, 0)
	reads(t, b.Meters[0], 4.35)
}

func noMeasurement(t *testing.T) {
	w, b := metering(t)
	answering(&w.meter.Listener, "READ?", "9.91E37\n")
	if s, err := b.Meters[0].Read(t.Context()); err != nil || s.Outcome != instruments.NotANumber || !math.IsNaN(s.Value) {
		t.Errorf("9.91E37: %+v, %v", s, err)
	}
	answering(&w.meter.Listener, "READ?", "****\n")
	_, err := b.Meters[0].Read(t.Context())
	wants(t, err, scpi.ErrForm, "****")
	if n, err := (scpi.NumberForm{NoValue: []string{"****"}}).Parse("****"); err != nil || n.Outcome != scpi.NoMeasurement {
		t.Errorf("stated by the dialect: %+v, %v", n, err)
	}
	reads(t, b.Meters[0], 4.35)
}

func stale(t *testing.T) {
	w, b := metering(t)
	for _, v := range []float64{1.5, 2.5, 3.5} {
		w.meter.Input(v, 0)
		reads(t, b.Meters[0], v)
	}
	if n := w.meter.Count("READ?"); n != 3 || w.meter.Count("FETC?") > 0 {
		t.Errorf("three readings took %d READ?", n)
	}
	w, b = scoping(t)
	for _, v := range []float64{0.4, 0.8} {
		w.scope.Signal = func(int, float64) float64 { return v }
		records(t, b.Scope, v)
	}
	if n := w.scope.Count("INIT"); n != 2 {
		t.Errorf("two records took %d INIT", n)
	}
}

func slowReading(t *testing.T) {
	w, b := metering(t)
	s, err := b.Meters[0].Configure(t.Context(), instruments.MeterSettings{Unit: si.Volt, Range: 10, Aperture: 2})
	must(t, err)
	begun := time.Now()
	reads(t, b.Meters[0], 4.35)
	if took := time.Since(begun); s.Aperture != 2 || took < 4*time.Second {
		t.Errorf("aperture %g s, the reading took %v; the link allows 2 s for a plain reply", s.Aperture, took)
	}
	answering(&w.meter.Listener, "READ?", "") // and still not for ever
}

// polledCompletion: a scope whose *OPC? answers 0 while it is busy (Rigol's manuals say so).
func polledCompletion(t *testing.T) {
	d := own(t, "standard-scope", `style = "held"`, "style = \"polled\"\nuntil = [\"1\"]")
	scope := drivertest.NewScope()
	scope.Signal = func(int, float64) float64 { return 0.4 }
	a, err := link.Parse("tcp://192.0.2.12:5025")
	must(t, err)
	l, err := link.Open(t.Context(), a, link.Options{Dial: scope.Dial})
	must(t, err)
	defer l.Close()
	s, _, err := driver.OpenScope(t.Context(), scpi.New(l, driver.Settings(d)), d, driver.Options{Name: "scope", Clock: instruments.NewClock(1)})
	must(t, err)
	_, err = s.Configure(t.Context(), aScreen)
	must(t, err)
	var begun time.Time
	scope.Fate = func(m string) (f drivertest.Fate) {
		switch {
		case m == "INIT":
			begun = time.Now()
		case m == "*OPC?" && time.Since(begun) < 300*time.Millisecond:
			f.Reply = "0\n"
		}
		return f
	}
	records(t, s, 0.4)
	if time.Since(begun) < 300*time.Millisecond {
		t.Error("a busy scope was taken to be done")
	}
}

func noTrigger(t *testing.T) {
	w, b := scoping(t)
	w.scope.Dead = true
	waves, err := b.Scope.Capture(t.Context())
	must(t, err)
	if waves[0].Triggered || len(waves[0].Codes) != aScreen.Points {
		t.Errorf("triggered %v, %d samples", waves[0].Triggered, len(waves[0].Codes))
	}
	w.scope.Dead = false
	if waves, err = b.Scope.Capture(t.Context()); err != nil || !waves[0].Triggered {
		t.Errorf("the next record: %v", err)
	}
}

func probeFactor(t *testing.T) {
	w := newWired()
	b := opened(t, w, file(t), 1)
	answering(&w.scope.Listener, "INP1:ATT?", "1\n")
	_, err := b.Scope.Configure(t.Context(), aScreen)
	wants(t, err, driver.ErrRefused, "INP1:ATT 10", "1 when read back")
	if _, err := b.Scope.Capture(t.Context()); !isKind(err, driver.ErrNotConfigured) {
		t.Errorf("the next record: %v, want it refused", err)
	}
	got, err := b.Scope.Configure(t.Context(), aScreen)
	if err != nil || got.Channels[0].Probe != 10 {
		t.Errorf("in force %+v, %v", got, err)
	}
}

func killed(t *testing.T) {
	w := newWired()
	w.supply.Leave(9, true)
	b, err := OpenSupply(t.Context(), "tcp://192.0.2.10:5025", "standard-supply", 1, w.options(1))
	must(t, err)
	r := instruments.MakeSafe(t.Context(), instruments.NewClock(1), b.Bench, instruments.SafeSpec{})
	must(t, b.Close(t.Context()))
	if !r.Confirmed || w.supply.On() || r.Voltage == nil || *r.Voltage != 0 {
		t.Errorf("%+v", r)
	}
	if first := w.supply.Received()[0]; first != "OUTP OFF" {
		t.Errorf("the first word was %q", first)
	}
	w.supply.Leave(9, true)
	if again := opened(t, w, file(t), 1); !again.FoundOn || !strings.Contains(strings.Join(again.Info[0].Notes, " "), "was on already") {
		t.Errorf("found on: %+v", again.Info[0].Notes)
	}
}
