package bench

import (
	"context"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/practice"
	"nightbench/instruments/si"
)

// withCutoff serves a practice bench with a relay in the supply lead, and opens it.
func withCutoff(t *testing.T) (*practice.Bench, *Opened) {
	t.Helper()
	clock := instruments.NewClock(1)
	c := clocked(clock)
	c.Cutoff = true
	p, err := practice.New(c)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { p.Close() })
	changes := []string{"practice = true", "practice = true"}
	var relay string
	for n, i := range p.Instruments() {
		address, err := i.ServeTCP(t.Context(), "127.0.0.1:0")
		if err != nil {
			t.Fatal(err)
		}
		if i.Role == "cutoff" {
			relay = address
			continue
		}
		changes = append(changes, "tcp://192.0.2.1"+string(rune('0'+n))+":5025", address)
	}
	f, err := Read(written(t, strings.NewReplacer(changes...).Replace(wiredText)+"\n[cutoff]\naddress = \""+relay+"\"\n"))
	if err != nil {
		t.Fatal(err)
	}
	b, err := Open(t.Context(), f, Options{Clock: clock})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { b.Close(context.Background()) })
	return p, b
}

// The relay closes when it is fed, opens when it is told to, and opens by itself
// within its time when nobody feeds it: the board is without power, whatever the supply says.
func TestCutoffOpensUnlessFed(t *testing.T) {
	p, b := withCutoff(t)
	ctx := t.Context()
	if info := b.Info[len(b.Info)-1]; info.Role != "cutoff" || info.Dialect != "nightbench-relay" {
		t.Errorf("%+v", info)
	}
	must := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	must(b.Supply.SetCurrentLimit(ctx, si.Amperes(0.5)))
	must(b.Supply.SetVoltage(ctx, si.Volts(8)))
	must(b.Cutoff.Feed(ctx))
	must(b.Supply.SetOutput(ctx, true))
	load := func() float64 {
		t.Helper()
		if _, err := b.Meters[0].Configure(ctx, instruments.MeterSettings{Unit: si.Volt, Range: 10, Aperture: 0.02}); err != nil {
			t.Fatal(err)
		}
		s, err := b.Meters[0].Read(ctx)
		if err != nil {
			t.Fatal(err)
		}
		return s.Value
	}
	time.Sleep(200 * time.Millisecond)
	agrees(t, "load fed through the contact", load(), 2, 0.05)
	must(b.Cutoff.Open(ctx))
	time.Sleep(500 * time.Millisecond)
	agrees(t, "load behind the open contact", load(), 0, 0.1)
	if st, err := b.Supply.State(ctx); err != nil || !st.Output || st.Voltage.Value < 7.9 {
		t.Errorf("the supply itself is on and at its voltage: %+v, %v", st, err)
	}
	must(b.Cutoff.Feed(ctx))
	time.Sleep(200 * time.Millisecond)
	agrees(t, "load fed again", load(), 2, 0.05)
	time.Sleep(3500 * time.Millisecond)
	agrees(t, "load 3.5 s after the last feeding", load(), 0, 0.1)
	if err := p.Inject(practice.Fault{Kind: practice.Silence, On: "cutoff"}); err != nil {
		t.Fatal(err)
	}
	if err := b.Cutoff.Feed(ctx); err == nil {
		t.Error("a relay that does not answer has been fed")
	}
}

func TestCutoffFileNeedsAnAddress(t *testing.T) {
	_, err := Read(written(t, wiredText+"\n[cutoff]\nadress = \"tcp://192.0.2.15:5025\"\n"))
	if err == nil || !strings.Contains(err.Error(), "cutoff.adress") {
		t.Errorf("%v", err)
	}
}
