package app

import (
	"context"
	"log/slog"
	"os"
	"path/filepath"
	"testing"
	"time"

	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/practice/circuit"
	"nightbench/sweeps"
	"nightbench/sweeps/example"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// night is one run through the whole tool: practice bench on pseudo-terminals,
// daemon, journal. What is not set is the example's.
type night struct {
	board  string               // text of the board file
	plan   string               // text of the plan file; its board is board.toml
	beside map[string]string    // text of more files beside the board, by name
	bench  func(string) string  // changes the example bench's text; nil: as it is
	alter  func(*circuit.Board) // changes the true board, unknown to the daemon; nil: not
	seed   uint64               // of specimen and instruments; 0: nominal parts
	pace   float64
}

// run conducts the night and returns its run and points.
func (n night) run(t *testing.T) (sweeps.Run, []sweeps.Point) {
	t.Helper()
	dir := t.TempDir()
	write := func(name, text string) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	for name, text := range n.beside {
		write(name, text)
	}
	board, err := sweeps.ReadBoard(write("board.toml", n.board))
	if err != nil {
		t.Fatal(err)
	}
	text := example.Text(example.Bench)
	if n.bench != nil {
		text = n.bench(text)
	}
	wired, err := bench.Read(write("wired.toml", text))
	if err != nil {
		t.Fatal(err)
	}
	clock := instruments.NewClock(n.pace)
	p, err := OpenPractice(t.Context(), PracticeOptions{Board: board, Wiring: wired.Wiring, Clock: clock, Seed: n.seed})
	if err != nil {
		t.Fatal(err)
	}
	defer p.Close()
	if n.alter != nil {
		if err := p.Alter(n.alter); err != nil {
			t.Fatal(err)
		}
	}
	path, err := p.WriteBench(dir, text, n.pace)
	if err != nil {
		t.Fatal(err)
	}
	file, err := bench.Read(path)
	if err != nil {
		t.Fatal(err)
	}
	return conducted(t, dir, write("plan.toml", n.plan), file, clock)
}

// conducted serves the bench, runs the plan to its end, and reads the journal.
func conducted(t *testing.T, dir, plan string, file *bench.File, clock instruments.Clock) (sweeps.Run, []sweeps.Point) {
	t.Helper()
	ctx, end := context.WithTimeout(t.Context(), 2*time.Minute)
	defer end()
	state := filepath.Join(dir, "state")
	ended := make(chan error, 1)
	err := Serve(ctx, t.Context(), Options{
		State: state, Bench: Given(file), Listen: "127.0.0.1:0", Version: "test", Clock: clock, Log: slog.New(slog.DiscardHandler),
		Ready: func(d *Daemon, _ string) {
			run, err := d.Start(ctx, web.StartRequest{Plan: plan, Operator: "test"})
			if err != nil {
				ended <- err
				end()
				return
			}
			go func() {
				_, err := d.Wait(ctx, run.ID)
				ended <- err
				end()
			}()
		},
	})
	if err != nil {
		t.Fatal(err)
	}
	if err := <-ended; err != nil {
		t.Fatal(err)
	}
	s, err := store.OpenReader(t.Context(), Database(state))
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close(t.Context())
	run, err := s.Run(t.Context(), 1)
	if err != nil {
		t.Fatal(err)
	}
	points, err := s.Points(t.Context(), 1)
	if err != nil {
		t.Fatal(err)
	}
	if run.State != sweeps.Done {
		t.Fatalf("the run ended %s: %s", run.State, run.Reason)
	}
	return run, points
}

// value is a quantity's value at a point, or a failed test.
func value(t *testing.T, p sweeps.Point, q sweeps.Quantity) (x, u float64) {
	t.Helper()
	r, ok := p.Reading(q)
	if !ok || r.Value == nil {
		t.Fatalf("point %d has no %s: %+v", p.Setpoint.Index, q, r)
	}
	return *r.Value, *r.U
}
