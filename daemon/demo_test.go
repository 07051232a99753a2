package main

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"nightbench/daemon/store"
	"nightbench/sweeps"
)

func TestDemoOnceRunsTheSampleToItsEnd(t *testing.T) {
	state := filepath.Join(t.TempDir(), "state")
	out, status := once(t, "demo", "--once", "--seed", "0", "--pace", "30", "--state", state)
	if status != 0 {
		t.Fatalf("status %d:\n%s", status, out)
	}
	for _, want := range []string{"practice bench at 30 times", "Switching off by software is no emergency stop", "48 of 48 points", "average voltage", "Ambient not measured: 27\u00a0°C assumed."} {
		if !strings.Contains(out, want) {
			t.Errorf("%q is not printed", want)
		}
	}
	intact(t, state)
	points := pointsOf(t, state, 1)
	sane(t, points)
	if log := supplyLog(t, state); log[len(log)-1].Output != nil && *log[len(log)-1].Output {
		t.Error("the demo ended with the output on")
	}
	shown, status := once(t, "show", "1", "--json", "--state", state)
	if status != 0 || !strings.Contains(shown, `"motor_current"`) || !strings.Contains(shown, `"predicted"`) {
		t.Errorf("show --json: status %d, %.200s", status, shown)
	}
}

func pointsOf(t *testing.T, state string, run int64) (points []sweeps.Point) {
	t.Helper()
	err := reading(t.Context(), state, func(s *store.Store) (err error) {
		points, err = s.Points(context.Background(), run)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return points
}

// sane holds the sample run against what must be so on any specimen: every wanted
// quantity has a value with an uncertainty and a prediction, and nearly all lie in the
// band, widened by the measurement's own uncertainty.
func sane(t *testing.T, points []sweeps.Point) {
	t.Helper()
	wanted := []sweeps.Quantity{sweeps.Duty, sweeps.Frequency, sweeps.AverageVoltage, sweeps.OutputDrop, sweeps.MotorCurrent, sweeps.SupplyCurrent}
	inside, all := 0, 0
	for _, p := range points {
		for _, q := range wanted {
			r, ok := p.Reading(q)
			x, predicted := p.Predictions[q]
			if !ok || r.Value == nil || r.U == nil || !(*r.U > 0) || !predicted {
				t.Errorf("point %d: %s is %+v, predicted %v", p.Setpoint.Index, q, r, predicted)
				continue
			}
			all++
			if *r.Value > x.Low-2**r.U && *r.Value < x.High+2**r.U {
				inside++
			}
		}
	}
	if inside < all*9/10 {
		t.Errorf("%d of %d readings lie in their band; a specimen within tolerance gives nearly all", inside, all)
	}
}

// TestPracticeBenchByHand talks to every practice instrument with a program that
// knows nothing of this one: the daemon's way to the bench is a real port.
func TestPracticeBenchByHand(t *testing.T) {
	if _, err := exec.LookPath("socat"); err != nil {
		t.Fatal("socat is missing: 'make setup' installs it")
	}
	for _, tcp := range []bool{false, true} {
		t.Run(fmt.Sprintf("tcp=%v", tcp), func(t *testing.T) {
			state := fromHere(t, filepath.Join(t.TempDir(), "bench"))
			args := []string{"demo", "--bench-only", "--seed", "0", "--pace", "20", "--state", state}
			if tcp {
				args = append(args, "--tcp")
			}
			p := start(t, args...)
			p.until("bench file:")
			found := 0
			for line := range strings.Lines(p.text()) {
				f := strings.Fields(line)
				if len(f) != 3 || f[0] != "practice" {
					continue
				}
				found++
				if path, serial := strings.CutPrefix(f[2], "serial://"); serial && !filepath.IsAbs(path) {
					t.Errorf("%s is served at %s, which is no address: it lacks the whole path", f[1], f[2])
				}
				byHand(t, f[1], f[2])
			}
			if found < 4 {
				t.Errorf("%d instruments are served, want supply, meters, scope and pot", found)
			}
			p.signal(syscall.SIGTERM)
			if status := p.end(); status != 0 {
				t.Errorf("status %d", status)
			}
		})
	}
}

// fromHere is a path as somebody types it who stands in this folder.
func fromHere(t *testing.T, path string) string {
	t.Helper()
	here, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	path, err = filepath.Rel(here, path)
	if err != nil {
		t.Fatal(err)
	}
	return path
}

// byHand asks who is there, makes a mistake, and reads the error queue.
func byHand(t *testing.T, name, address string) {
	t.Helper()
	lines := strings.Split(asked(t, address, "*IDN?\nNONSENSE:HEADER 1\nsyst:err?\n:SYSTem:ERRor:NEXT?\n"), "\n")
	if len(lines) != 3 || !strings.HasPrefix(lines[0], "Nightbench,practice-") || !strings.HasPrefix(lines[1], "-113,") || !strings.HasPrefix(lines[2], "0,") {
		t.Errorf("%s answers %q", name, lines)
	}
}

// asked says messages to a practice instrument through socat and gives what comes back.
func asked(t *testing.T, address, messages string) string {
	t.Helper()
	peer, ok := strings.CutPrefix(address, "serial://")
	peer += ",raw,echo=0"
	if !ok {
		peer = strings.Replace(address, "tcp://", "TCP:", 1)
	}
	ctx, cancel := context.WithTimeout(t.Context(), 20*time.Second)
	defer cancel()
	cmd := exec.CommandContext(ctx, "socat", "-t1", "-", peer)
	cmd.Stdin = strings.NewReader(messages)
	out, err := cmd.Output()
	if err != nil {
		t.Errorf("socat to %s: %v", address, err)
	}
	return strings.TrimSpace(string(out))
}
