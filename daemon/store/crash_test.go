package store

import (
	"bufio"
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"nightbench/instruments"
	"nightbench/sweeps"
)

const crashFolder = "NIGHTBENCH_CRASH_FOLDER"

// crashChild goes on with the open run where it stands (or begins one), saying
// each setpoint only after it was acknowledged. It never returns.
func crashChild(dir string) {
	fail := func(err error) {
		if err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
	}
	ctx := context.Background()
	s, err := Open(ctx, filepath.Join(dir, "nightbench.db"), instruments.NewClock(1))
	fail(err)
	run, open, err := s.OpenRun(ctx)
	fail(err)
	if !open {
		run, err = s.CreateRun(ctx, sampleRun())
		fail(err)
	}
	for i := run.Measured; ; i++ {
		_, err := s.Append(ctx, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(i)})
		fail(err)
		fmt.Println(i)
	}
}

// TestKilledWhileAppending kills a writing process again and again: every point
// acknowledged before is there, none twice, and the file is sound.
func TestKilledWhileAppending(t *testing.T) {
	killAgainAndAgain(t, 6, func(round int) int { return 3 + 7*round })
}

// killAgainAndAgain kills a child in each round after it has said as many setpoints as told, and looks at what it left.
func killAgainAndAgain(t *testing.T, rounds int, after func(round int) int) {
	t.Helper()
	dir := t.TempDir()
	last := -1
	for round := range rounds {
		last = max(last, killAfter(t, dir, after(round)))
		s := openAt(t, filepath.Join(dir, "nightbench.db"))
		var sound string
		if err := s.read.QueryRow(`PRAGMA integrity_check`).Scan(&sound); err != nil || sound != "ok" {
			t.Fatalf("integrity: %s %v", sound, err)
		}
		run, open, err := s.OpenRun(t.Context())
		if err != nil || !open {
			t.Fatal(open, err)
		}
		points, err := s.Points(t.Context(), run.ID)
		if err != nil {
			t.Fatal(err)
		}
		if len(points) <= last || run.Measured != len(points) {
			t.Errorf("acknowledged up to %d, stored %d, counted %d", last, len(points), run.Measured)
		}
		for i, p := range points {
			if p.Setpoint.Index != i || len(p.Readings) != 4 || len(p.Predictions) != 1 {
				t.Errorf("point %d is setpoint %d with %d readings", i, p.Setpoint.Index, len(p.Readings))
			}
		}
		if tail, err := s.Last(t.Context()); err != nil || tail != int64(len(points)) {
			t.Errorf("%d entries for %d points (%v)", tail, len(points), err)
		}
		s.Close(t.Context())
	}
}

// killAfter runs a child until it has said n setpoints, kills it with SIGKILL
// while it goes on, and answers the last setpoint it said.
func killAfter(t *testing.T, dir string, n int) (last int) {
	t.Helper()
	child := exec.Command(os.Args[0])
	child.Env = append(os.Environ(), crashFolder+"="+dir)
	var said strings.Builder
	child.Stderr = &said
	out, err := child.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := child.Start(); err != nil {
		t.Fatal(err)
	}
	last = -1
	lines := bufio.NewScanner(out)
	for i := 1; lines.Scan(); i++ { // reading on to the end takes in what was said up to the kill
		if last, err = strconv.Atoi(lines.Text()); err != nil {
			t.Fatal(err)
		}
		if i == n {
			child.Process.Kill()
		}
	}
	child.Wait()
	if said.Len() > 0 {
		t.Fatal(said.String())
	}
	return last
}
