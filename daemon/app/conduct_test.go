package app

import (
	"context"
	"errors"
	"log/slog"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
	"nightbench/sweeps/runner"
)

// holding is a daemon that holds the example bench, simulated, without its page.
func holding(t *testing.T) *Daemon {
	t.Helper()
	dir := t.TempDir()
	files := filepath.Join(dir, "files")
	must(t, example.Write(files))
	board, err := sweeps.ReadBoard(filepath.Join(files, example.BoardPump))
	must(t, err)
	wired, err := bench.Read(filepath.Join(files, example.Bench))
	must(t, err)
	clock := instruments.NewClock(100)
	p, err := OpenPractice(t.Context(), PracticeOptions{Board: board, Wiring: wired.Wiring, Clock: clock})
	must(t, err)
	t.Cleanup(func() { p.Close() })
	path, err := p.WriteBench(dir, wired.Text, 100)
	must(t, err)
	file, err := bench.Read(path)
	must(t, err)
	opened, err := bench.Open(t.Context(), file, bench.Options{Clock: clock})
	must(t, err)
	t.Cleanup(func() { opened.Close(context.Background()) })
	s, err := store.Open(t.Context(), Database(dir), clock)
	must(t, err)
	t.Cleanup(func() { s.Close(context.Background()) })
	return &Daemon{
		o: Options{Log: slog.New(slog.DiscardHandler)}, clock: clock, store: s, bench: opened, last: t.Context(),
		mark: &mark{path: energisedPath(dir), clock: clock, blank: Energised{Address: file.Supply.Address.String()}},
	}
}

func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

// A fault of this program in the conducting itself: the bench is made safe, the run
// ends as failed and says so, and the daemon goes on.
func TestFaultInConductingMakesSafe(t *testing.T) {
	d, ctx := holding(t), t.Context()
	run, err := d.store.CreateRun(ctx, sweeps.Run{State: sweeps.Preparing, StartedAt: d.clock.Now(), Planned: 1, Pace: 100})
	must(t, err)
	must(t, d.mark.Set(run.ID))
	supply := d.bench.Bench.Supply
	must(t, supply.SetVoltage(ctx, si.Volts(9)))
	must(t, supply.SetOutput(ctx, true))
	running, cancel := context.WithCancelCause(ctx)
	a := &active{id: run.ID, runner: runner.New(runner.Options{}), cancel: cancel, done: make(chan struct{})} // no clock: conducting it panics
	if !d.adopt(a, d.offs) {
		t.Fatal("not adopted")
	}
	go d.conduct(running, a)
	<-a.done
	if a.end.State != sweeps.Failed || !a.end.Off.Confirmed || !strings.Contains(a.end.Reason, "a fault in this program") {
		t.Errorf("ended %+v", a.end)
	}
	if running.Err() == nil {
		t.Error("the run's context is still there")
	}
	if s, err := supply.State(ctx); err != nil || s.Output {
		t.Errorf("the supply's output: %+v, %v", s, err)
	}
	if _, there, err := readEnergised(filepath.Dir(d.mark.path)); there || err != nil {
		t.Errorf("the energised record is there: %v, %v", there, err)
	}
	if v := d.Vitals(); v.Energised != sweeps.EnergisedNo || v.Run != 0 {
		t.Errorf("vitals: energised %s, run %d", v.Energised, v.Run)
	}
	kept, err := d.store.Run(ctx, run.ID)
	if err != nil || kept.State != sweeps.Failed || !strings.Contains(kept.Reason, "a fault in this program") {
		t.Errorf("the journal: %s %q, %v", kept.State, kept.Reason, err)
	}
}

// Stop holds on to the run it looked at: where none was open it is refused, and nothing is waited for.
func TestStopWithoutARun(t *testing.T) {
	ctx, cancel := context.WithTimeout(t.Context(), time.Second)
	defer cancel()
	err := (&Daemon{}).Stop(ctx, "", "AK")
	var refused web.Kinded
	if !errors.As(err, &refused) || refused.Kind() != web.Conflict || !strings.Contains(err.Error(), "stop: no run is open") {
		t.Errorf("got %v", err)
	}
	var none *active
	if err := none.command(runner.CmdHold, "AK"); err == nil {
		t.Error("a hold of no run passed")
	}
}
