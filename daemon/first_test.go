package main

import (
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"nightbench/daemon/app"
	"nightbench/daemon/web"
)

// TestSafeFirstWhateverElseIsBroken kills a daemon in the middle of a run and breaks
// what the next one is started with: the bench is made safe all the same, before the
// mistake is told.
func TestSafeFirstWhateverElseIsBroken(t *testing.T) {
	for name, c := range map[string]struct {
		spoil  func(t *testing.T, bench, state string)
		listen string
		says   string
	}{
		"bench file": {func(t *testing.T, bench, _ string) { write(t, bench, "[bench\n") }, "127.0.0.1:0", "bench.toml:1"},
		"database":   {spoilDatabase, "127.0.0.1:0", "nightbench.db"},
		"address":    {func(*testing.T, string, string) {}, "0.0.0.0:0", "only loopback"},
	} {
		t.Run(name, func(t *testing.T) {
			dir := t.TempDir()
			benchState, state := filepath.Join(dir, "bench"), filepath.Join(dir, "state")
			start(t, "demo", "--bench-only", "--seed", "0", "--pace", "20", "--state", benchState).until("bench file:")
			bench := filepath.Join(benchState, "bench.toml")
			daemon := start(t, "serve", bench, "--listen", "127.0.0.1:0", "--state", state)
			daemon.until("operator's token")
			api(t, state, http.MethodPost, "/api/runs", web.StartRequest{Plan: filepath.Join(benchState, "files", "sample.toml")}, nil)
			eventually(t, "the output is on", func() bool { return on(t, benchState) })
			daemon.signal(syscall.SIGKILL)
			daemon.end()
			c.spoil(t, bench, state)
			out, status := once(t, "serve", bench, "--listen", c.listen, "--state", state)
			if status == 0 || !strings.Contains(out, c.says) {
				t.Errorf("status %d, want a failure that names %q:\n%s", status, c.says, out)
			}
			if on(t, benchState) {
				t.Error("the output is still on")
			}
			if !strings.Contains(out, "off, confirmed") {
				t.Errorf("nobody said that off is confirmed:\n%s", out)
			}
			if name != "address" {
				return
			}
			// The next start, with nothing broken, has it in the journal.
			start(t, "serve", bench, "--listen", "127.0.0.1:0", "--state", state).until("operator's token")
			if run := get[web.RunDetail](t, state, "/api/runs/1").Run; run.State != "interrupted" || !strings.Contains(run.Reason, "switched off at the next start, confirmed by supply") {
				t.Errorf("the journal says %s: %s", run.State, run.Reason)
			}
		})
	}
}

func spoilDatabase(t *testing.T, _, state string) {
	for _, suffix := range []string{"-wal", "-shm"} {
		os.Remove(app.Database(state) + suffix) // they would mend it
	}
	write(t, app.Database(state), "this is no database, "+strings.Repeat("no ", 4096))
}

func write(t *testing.T, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
}

// on tells whether the practice supply's output is on, by its own log.
func on(t *testing.T, benchState string) (is bool) {
	t.Helper()
	for _, l := range supplyLog(t, benchState) {
		if l.Output != nil {
			is = *l.Output
		}
	}
	return is
}

// TestOffWithoutARun switches off an output that somebody switched on at the panel.
func TestOffWithoutARun(t *testing.T) {
	dir := t.TempDir()
	benchState, state := filepath.Join(dir, "bench"), filepath.Join(dir, "state")
	p := start(t, "demo", "--bench-only", "--seed", "0", "--pace", "20", "--state", benchState)
	p.until("bench file:")
	supply := ""
	for line := range strings.Lines(p.text()) {
		if f := strings.Fields(line); len(f) == 3 && f[1] == "supply" {
			supply = f[2]
		}
	}
	bench := filepath.Join(benchState, "bench.toml")
	asked(t, supply, "CURR 0.5\nVOLT 9\nOUTP ON\n")
	daemon := start(t, "serve", bench, "--listen", "127.0.0.1:0", "--state", state)
	daemon.until("operator's token")
	if v := get[web.Status](t, state, "/api/status").Vitals; v.Energised != "yes" {
		t.Errorf("found on, and energised is %q", v.Energised)
	}
	out, status := once(t, "start", filepath.Join(benchState, "files", "sample.toml"), "--state", state)
	if status == 0 || !strings.Contains(out, "output is on though no run is open") {
		t.Errorf("a start on an energised bench: status %d, %q", status, out)
	}
	if out, status := once(t, "stop", "--state", state); status != 0 || !strings.Contains(out, "confirmed") {
		t.Errorf("stop without a run: status %d, %q", status, out)
	}
	if on(t, benchState) {
		t.Error("the output is still on")
	}
	if out, status := once(t, "off", "--state", state); status != 0 || !strings.Contains(out, "confirmed") {
		t.Errorf("off: status %d, %q", status, out)
	}
	// The practice bench is gone: nobody sees the output any more, and that is said.
	p.signal(syscall.SIGKILL)
	p.end()
	for deadline := time.Now().Add(30 * time.Second); get[web.Status](t, state, "/api/status").Vitals.Energised != "unconfirmed"; time.Sleep(200 * time.Millisecond) {
		if time.Now().After(deadline) {
			t.Fatal("the supply does not answer any more, and off is still claimed")
		}
	}
	daemon.signal(syscall.SIGTERM)
	if status := daemon.end(); status != 0 {
		t.Errorf("status %d", status)
	}
}
