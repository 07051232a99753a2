package main

import (
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"nightbench/daemon/web"
	"nightbench/sweeps"
)

// TestCommandsThroughTheDaemon does a night by hand: serve, start, hold, resume,
// stop, resume to the end, with the exit statuses that go with it.
func TestCommandsThroughTheDaemon(t *testing.T) {
	dir := t.TempDir()
	benchState, state := filepath.Join(dir, "bench"), filepath.Join(dir, "state")
	start(t, "demo", "--bench-only", "--seed", "0", "--pace", "20", "--state", benchState).until("bench file:")
	plan := filepath.Join(benchState, "files", "sample.toml")
	daemon := start(t, "serve", filepath.Join(benchState, "bench.toml"), "--listen", "127.0.0.1:0", "--state", state)
	daemon.until("operator's token")

	waiting := start(t, "start", plan, "--wait", "--operator", "AK", "--board-serial", "0017", "--state", state)
	measured := func(n int) func() bool {
		return func() bool { return get[web.RunDetail](t, state, "/api/runs/1").Run.Measured >= n }
	}
	eventually(t, "two points", func() bool {
		return len(get[web.Runs](t, state, "/api/runs").Runs) == 1 && measured(2)()
	})
	if out, status := once(t, "start", plan, "--state", state); status != 1 || !strings.Contains(out, "run 1 is open") {
		t.Errorf("a second start: status %d, %q", status, out)
	}
	if out, status := once(t, "hold", "--state", state); status != 0 {
		t.Fatalf("hold: status %d, %q", status, out)
	}
	eventually(t, "held", func() bool { return get[web.RunDetail](t, state, "/api/runs/1").Run.State == sweeps.HeldState })
	if v := get[web.Status](t, state, "/api/status").Vitals; v.Energised != sweeps.EnergisedNo {
		t.Errorf("held, and energised is %q", v.Energised)
	}
	if out, status := once(t, "resume", "--state", state); status != 0 {
		t.Fatalf("resume of a held run: status %d, %q", status, out)
	}
	eventually(t, "running again", func() bool { return get[web.RunDetail](t, state, "/api/runs/1").Run.State == sweeps.Running })
	if out, status := once(t, "stop", "--by", "AK", "--state", state); status != 0 || !strings.Contains(out, "confirmed") {
		t.Fatalf("stop: status %d, %q", status, out)
	}
	if status := waiting.end(); status != exitInterrupted || !strings.Contains(waiting.text(), "run 1 stopped: stopped by AK") {
		t.Errorf("start --wait: status %d, %q", status, waiting.text())
	}
	if out, status := once(t, "resume", "--wait", "--state", state); status != 0 || !strings.Contains(out, "48 of 48 points") {
		t.Errorf("resume --wait: status %d, %q", status, out)
	}
	if out, status := once(t, "runs", "--state", state); status != 0 || !strings.Contains(out, "done") || !strings.Contains(out, "0017") {
		t.Errorf("runs: status %d, %q", status, out)
	}
	if out, status := once(t, "resume", "1", "--state", state); status != 1 || !strings.Contains(out, "only an interrupted") {
		t.Errorf("resume of a run that is done: status %d, %q", status, out)
	}
	complete(t, state)
	daemon.signal(syscall.SIGINT)
	if status := daemon.end(); status != 0 {
		t.Errorf("the daemon ended with status %d", status)
	}
}

// Resuming energises: only the newest run may be meant without being named.
func TestResumeNeverImpliesAnOlderRun(t *testing.T) {
	weeksAgo := time.Date(2026, 11, 2, 21, 0, 0, 0, time.Local)
	run := func(id int64, s sweeps.State) sweeps.Run {
		return sweeps.Run{ID: id, State: s, Plan: "Night", StartedAt: weeksAgo, Measured: 12, Planned: 48}
	}
	for name, c := range map[string]struct {
		runs    []sweeps.Run // newest first
		args    []string
		want    int64
		refused string
	}{
		"newest stopped":       {runs: []sweeps.Run{run(3, sweeps.Stopped), run(2, sweeps.Tripped)}, want: 3},
		"newest held":          {runs: []sweeps.Run{run(3, sweeps.HeldState)}, want: 3},
		"newest done":          {runs: []sweeps.Run{run(3, sweeps.Done), run(2, sweeps.Interrupted)}, refused: "'nightbench resume 2' goes on with plan \"Night\", interrupted, begun 2026-11-02 21:00, 12 of 48 points"},
		"newest running":       {runs: []sweeps.Run{run(3, sweeps.Running), run(2, sweeps.Stopped)}, refused: "the newest run, 3, is running"},
		"all done":             {runs: []sweeps.Run{run(3, sweeps.Done)}, refused: "no run can be resumed"},
		"none":                 {refused: "there is no run yet"},
		"an older one, named":  {runs: []sweeps.Run{run(3, sweeps.Done), run(2, sweeps.Interrupted)}, args: []string{"2"}, want: 2},
		"one that isn't there": {runs: []sweeps.Run{run(3, sweeps.Done)}, args: []string{"7"}, refused: "there is no run 7"},
	} {
		got, err := pick(c.runs, c.args)
		if got.ID != c.want || (err == nil) != (c.refused == "") || err != nil && !strings.Contains(err.Error(), c.refused) {
			t.Errorf("%s: run %d, %v; want %d, %q", name, got.ID, err, c.want, c.refused)
		}
	}
}
