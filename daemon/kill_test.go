package main

import (
	"database/sql"
	"math/rand/v2"
	"net/http"
	"path/filepath"
	"syscall"
	"testing"
	"time"

	"nightbench/daemon/app"
	"nightbench/daemon/web"
	"nightbench/instruments/practice"
	"nightbench/sweeps"

	_ "github.com/mattn/go-sqlite3"
)

// kills is how often the daemon is killed in the middle of a run.
const kills = 20

// TestKilledAtRandomInstants kills the daemon with SIGKILL again and again while
// the practice bench, a process of its own, goes on. The first thing each new
// daemon does is to make the bench safe; a person's resume goes on; in the end
// every setpoint is there exactly once.
func TestKilledAtRandomInstants(t *testing.T) {
	dir := t.TempDir()
	benchState, state := filepath.Join(dir, "bench"), filepath.Join(dir, "state")
	practiceBench := start(t, "demo", "--bench-only", "--seed", "0", "--pace", "20", "--state", benchState)
	practiceBench.until("bench file:")
	bench, plan := filepath.Join(benchState, "bench.toml"), filepath.Join(benchState, "files", "sample.toml")
	seed := uint64(time.Now().UnixNano())
	t.Logf("seed %d", seed)
	r := rand.New(rand.NewPCG(seed, 0))

	serve := func() *process {
		p := start(t, "serve", bench, "--listen", "127.0.0.1:0", "--state", state)
		p.until("operator's token")
		return p
	}
	daemon := serve()
	api(t, state, http.MethodPost, "/api/runs", web.StartRequest{Plan: plan}, nil)
	killed, energised := 0, 0
	for ; killed < kills; killed++ {
		time.Sleep(time.Duration(r.IntN(1500)) * time.Millisecond)
		if get[web.RunDetail](t, state, "/api/runs/1").Run.State.Ended() {
			break
		}
		daemon.signal(syscall.SIGKILL)
		daemon.end()
		time.Sleep(50 * time.Millisecond) // what the dead daemon had sent is heard by now
		heard := len(supplyLog(t, benchState))
		daemon = serve()
		if safeFirst(t, supplyLog(t, benchState), heard) {
			energised++
		}
		if run := get[web.RunDetail](t, state, "/api/runs/1").Run; run.State != sweeps.Interrupted {
			t.Fatalf("after kill %d the run is %s, want interrupted", killed+1, run.State)
		}
		api(t, state, http.MethodPost, "/api/runs/1/resume", web.ResumeRequest{Operator: "test"}, nil)
	}
	if killed < kills {
		t.Fatalf("the run was over after %d kills of %d: slow it down", killed, kills)
	}
	if t.Logf("%d of %d kills with the output on", energised, kills); energised <= kills/2 {
		t.Errorf("the output was on at %d of %d kills only: kill later after the resume", energised, kills)
	}
	waitEnded(t, state)
	complete(t, state)
	daemon.signal(syscall.SIGTERM)
	if status := daemon.end(); status != 0 {
		t.Errorf("the daemon ended with status %d", status)
	}
}

// safeFirst looks at the supply's log since a kill: where the output was on, it
// went off before anything but identification and the off itself was said. It tells
// whether it was on.
func safeFirst(t *testing.T, log []practice.LogLine, since int) bool {
	t.Helper()
	on := false
	for _, l := range log[:since] {
		if l.Output != nil {
			on = *l.Output
		}
	}
	if !on {
		return false
	}
	for _, l := range log[since:] {
		if l.Output != nil && !*l.Output {
			return true
		}
		switch l.Heard {
		case "", "*IDN?", "*OPC?", "OUTP OFF", "*CLS":
		default:
			t.Fatalf("the output was on, and the new daemon said %q before it was off", l.Heard)
		}
	}
	t.Fatal("the output was on, and the new daemon never switched it off")
	return true
}

func waitEnded(t *testing.T, state string) {
	t.Helper()
	for deadline := time.Now().Add(2 * time.Minute); time.Now().Before(deadline); time.Sleep(200 * time.Millisecond) {
		run := get[web.RunDetail](t, state, "/api/runs/1").Run
		if run.State == sweeps.Done {
			return
		}
		if run.State.Ended() {
			t.Fatalf("the run ended %s: %s", run.State, run.Reason)
		}
	}
	t.Fatal("the run did not end")
}

// complete checks that every setpoint is there exactly once, and the database whole.
func complete(t *testing.T, state string) {
	t.Helper()
	detail, points := get[web.RunDetail](t, state, "/api/runs/1"), get[web.Points](t, state, "/api/runs/1/points").Points
	seen := map[int]int{}
	for _, p := range points {
		seen[p.Setpoint.Index]++
	}
	if len(points) != len(detail.Setpoints) || len(seen) != len(detail.Setpoints) {
		t.Errorf("%d points over %d setpoints of %d", len(points), len(seen), len(detail.Setpoints))
	}
	intact(t, state)
}

func intact(t *testing.T, state string) {
	t.Helper()
	db, err := sql.Open("sqlite3", "file:"+app.Database(state)+"?mode=ro")
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	var verdict string
	if err := db.QueryRow("PRAGMA integrity_check").Scan(&verdict); err != nil || verdict != "ok" {
		t.Errorf("integrity_check: %q, %v", verdict, err)
	}
}
