//go:build benchtest

package conformance

import (
	"context"
	"os"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/link"
)

// TestRealBench holds the instruments of a bench file against the same table, through
// make bench-test, which asks first whether anything is connected. It sends queries,
// mistakes, and settings at output off; never output on, *TST? or a protection clear.
func TestRealBench(t *testing.T) {
	if os.Getenv("NIGHTBENCH_NOTHING_CONNECTED") != "yes" {
		t.Fatal("start it with: make bench-test BENCH=bench.toml")
	}
	file, err := bench.Read(os.Getenv("NIGHTBENCH_BENCH"))
	if err != nil {
		t.Fatal(err)
	}
	infos := off(t, file)
	ports := append([]bench.Port{file.Supply}, file.Meters...)
	for _, p := range []*bench.Port{file.Scope, file.Pot, file.Cutoff} {
		if p != nil {
			ports = append(ports, *p)
		}
	}
	for n, p := range ports {
		t.Run(infos[n].Name, func(t *testing.T) { hold(t, p.Address, infos[n].Role) })
	}
	off(t, file)
}

// off opens the bench, sees that the output is off, and closes it again.
func off(t *testing.T, file *bench.File) []bench.Info {
	t.Helper()
	b, err := bench.Open(t.Context(), file, bench.Options{Clock: instruments.NewClock(file.Pace)})
	if err != nil {
		t.Fatal(err)
	}
	defer b.Close(context.Background())
	if b.FoundOn {
		t.Fatal("the supply's output is on: switch it off, see that nothing is connected, and start again")
	}
	if err := b.Supply.SetOutput(t.Context(), false); err != nil {
		t.Fatal(err)
	}
	return b.Info
}

// hold carries on every harmless exchange with one instrument.
func hold(t *testing.T, address link.Address, role string) {
	l, err := link.Open(t.Context(), address, link.Options{Timeout: 3 * time.Second})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	sent, kept := 0, 0
	for _, e := range append(append([]Exchange{}, Common...), Of[role]...) {
		if !e.Harmless() {
			kept++
			continue
		}
		sent++
		if err := Check(t.Context(), wire{l}, e); err != nil {
			t.Error(err)
			resync(t, l)
		}
	}
	t.Logf("%d exchanges, %d not sent to a real instrument", sent, kept)
}

// wire is a link as a Talker.
type wire struct{ *link.Link }

func (w wire) Send(ctx context.Context, message string) error { return w.Link.Send(ctx, message) }

func (w wire) Ask(ctx context.Context, message string) (string, error) { return w.Query(ctx, message) }

// resync lets a late reply pass before the next exchange.
func resync(t *testing.T, l *link.Link) {
	t.Helper()
	if err := l.Clear(t.Context()); err != nil {
		t.Fatal(err)
	}
}
