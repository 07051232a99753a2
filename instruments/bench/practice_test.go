package bench

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
	"nightbench/instruments/practice"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
)

// clocked is a board without a timer of its own: 1 kHz at a duty of 0.25 into
// 100 Ω, so that what the instruments must read is known beforehand.
func clocked(clock instruments.Clock) practice.Config {
	return practice.Config{
		Board: circuit.Board{
			Source: circuit.Source{Resistance: 0.05, Bulk: 100e-6, Bleed: 470},
			Timing: circuit.Timing{Network: circuit.Clocked, Period: 1e-3, Duty: 0.25},
			Timer:  circuit.Timer{Threshold: 2. / 3, Trigger: 1. / 3, MinSupply: 2},
			Driver: circuit.Driver{Stage: circuit.NMOS, Resistance: 0.05},
			Load:   circuit.Load{Kind: circuit.Resistor, Resistance: 100},
		},
		Clock: clock, Seed: 7,
		Meters:   []practice.Meter{{Name: "average", Probe: circuit.Between(circuit.LoadHi, circuit.LoadLo), Unit: si.Volt}},
		Channels: []practice.Channel{{Number: 1, Probe: circuit.Between(circuit.LoadLo, circuit.Common)}},
		Pot:      practice.Pot{Codes: 257, Track: 100e3, Wiper: 75, Start: 128},
	}
}

// onPorts serves a practice bench on real pseudo-terminals and gives the bench file that leads there.
func onPorts(t *testing.T, clock instruments.Clock) (*practice.Bench, *File) {
	t.Helper()
	p, err := practice.New(clocked(clock))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { p.Close() })
	changes := []string{"practice = true", "practice = true\npace = 20"}
	for n, i := range p.Instruments() {
		address, err := i.ServePTY()
		if err != nil {
			t.Fatal(err)
		}
		changes = append(changes, "tcp://192.0.2.1"+string(rune('0'+n))+":5025", address)
	}
	return p, file(t, changes...)
}

// The practice instruments are written from the dialect files by other hands;
// this is where both sides meet, on real serial ports.
func TestPracticeBenchOnRealPorts(t *testing.T) {
	clock := instruments.NewClock(20)
	p, f := onPorts(t, clock)
	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	b, err := Open(ctx, f, Options{Clock: clock})
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close(context.Background())

	t.Run("PortInUse", func(t *testing.T) {
		_, err := Open(ctx, f, Options{Clock: clock})
		if !errors.Is(err, link.ErrBusy) || !strings.Contains(err.Error(), "supply") {
			t.Errorf("a second bench on the same ports: %v", err)
		}
	})
	t.Run("Energise", func(t *testing.T) {
		for _, do := range []error{
			b.Supply.Protect(ctx, si.Volts(14)), b.Supply.SetCurrentLimit(ctx, si.Amperes(0.5)),
			b.Supply.SetVoltage(ctx, si.Volts(8)), b.Pot.SetCode(ctx, 200), b.Supply.SetOutput(ctx, true),
		} {
			if do != nil {
				t.Fatal(do)
			}
		}
		if err := clock.Sleep(ctx, time.Second); err != nil {
			t.Fatal(err)
		}
		st, err := b.Supply.State(ctx)
		if err != nil || !st.Output || st.Limiting || st.Tripped {
			t.Fatalf("%+v, %v", st, err)
		}
		agrees(t, "supply voltage", st.Voltage.Value, 8, st.Voltage.Accuracy.Limit(8, 0)+0.0005*8+10e-3) // programming adds 0.05 % + 10 mV
		agrees(t, "supply current", st.Current.Value, 8*0.25/100, st.Current.Accuracy.Limit(0.037, 0)+1e-3)
	})
	t.Run("Meter", func(t *testing.T) {
		if _, err := b.Meters[0].Configure(ctx, instruments.MeterSettings{Unit: si.Volt, Range: 10, Aperture: 0.2}); err != nil {
			t.Fatal(err)
		}
		s, err := b.Meters[0].Read(ctx)
		if err != nil || s.Outcome != instruments.Measured {
			t.Fatalf("%+v, %v", s, err)
		}
		agrees(t, "average voltage", s.Value, 2, 10e-3) // 0.25 of 8 V; the supply is set within 0.05 % + 10 mV
	})
	t.Run("Scope", func(t *testing.T) {
		if _, err := b.Scope.Configure(ctx, instruments.ScopeSettings{Points: 4000, Duration: 0.02,
			Channels: []instruments.ScopeChannel{{Number: 1, Low: -1, High: 10, Probe: 10}}, Trigger: instruments.ScopeTrigger{Channel: 1, Level: 4}}); err != nil {
			t.Fatal(err)
		}
		w, err := b.Scope.Capture(ctx)
		if err != nil || !w[0].Triggered {
			t.Fatalf("%v", err)
		}
		low := 0
		for _, c := range w[0].Codes {
			if float64(c)*w[0].VoltsPerCode+w[0].VoltsAtZero < 4 {
				low++
			}
		}
		agrees(t, "share of the time the load is driven", float64(low)/float64(len(w[0].Codes)), 0.25, 2e-3)
		if got, want := w[0].Start, -0.002; math.Abs(got-want) > w[0].Interval {
			t.Errorf("the record starts at %g s, a tenth before the trigger is %g s", got, want)
		}
	})
	t.Run("NoTrigger", func(t *testing.T) {
		if _, err := b.Scope.Configure(ctx, instruments.ScopeSettings{Points: 1000, Duration: 0.02,
			Channels: []instruments.ScopeChannel{{Number: 1, Low: -1, High: 20, Probe: 10}}, Trigger: instruments.ScopeTrigger{Channel: 1, Level: 15}}); err != nil {
			t.Fatal(err)
		}
		w, err := b.Scope.Capture(ctx)
		if err != nil || w[0].Triggered || len(w[0].Codes) != 1000 {
			t.Fatalf("%v", err)
		}
	})
	t.Run("AlterIsNoticedByNobodyButTheInstruments", func(t *testing.T) {
		if err := p.Alter(func(c *circuit.Board) { c.Load.Resistance = 10 }); err != nil {
			t.Fatal(err)
		}
		if err := clock.Sleep(ctx, time.Second); err != nil {
			t.Fatal(err)
		}
		st, err := b.Supply.State(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if st.Current.Value < 0.15 {
			t.Errorf("%g A into 10 Ω", st.Current.Value)
		}
	})
	t.Run("MakeSafe", func(t *testing.T) {
		r := instruments.MakeSafe(ctx, clock, b.Bench, instruments.SafeSpec{})
		if !r.Confirmed || !r.Parked || len(r.By) != 2 || r.Err != nil {
			t.Errorf("%+v", r)
		}
		code, err := b.Pot.Code(ctx)
		if err != nil || code != 256 {
			t.Errorf("parked at %d, %v", code, err)
		}
	})
}

func agrees(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if math.Abs(got-want) > within {
		t.Errorf("%s: %.5g, expected %.5g ± %.2g", what, got, want, within)
	}
}

// The supply's practice end goes away while it feeds: off is tried on a new
// link, which is not to be had, and nothing pretends that it worked.
func TestSupplyThatIsUnpluggedWhileOn(t *testing.T) {
	clock := instruments.NewClock(20)
	p, f := onPorts(t, clock)
	b, err := Open(t.Context(), f, Options{Clock: clock})
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close(context.Background())
	if err := b.Supply.SetOutput(t.Context(), true); err != nil {
		t.Fatal(err)
	}
	p.Close()
	ctx, cancel := context.WithTimeout(t.Context(), 2*time.Second)
	defer cancel()
	r := instruments.MakeSafe(ctx, clock, b.Bench, instruments.SafeSpec{Step: 300 * time.Millisecond, Again: 100 * time.Millisecond})
	if r.Confirmed || r.Err == nil || !strings.Contains(r.Words, "NOT CONFIRMED OFF") {
		t.Errorf("%+v", r)
	}
	if _, err := b.Supply.State(ctx); err == nil {
		t.Error("an unplugged supply has a state")
	}
	var e *driver.Error
	if !errors.As(r.Err, &e) || e.Instrument != "supply" {
		t.Errorf("cause %v", r.Err)
	}
}
