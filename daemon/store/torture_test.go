//go:build torture

package store

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"syscall"
	"testing"

	"golang.org/x/sys/unix"

	"nightbench/instruments"
	"nightbench/sweeps"
)

const diskFolder = "NIGHTBENCH_DISK_FOLDER"

func init() {
	if dir := os.Getenv(diskFolder); dir != "" {
		if err := fillADisk(dir); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
}

// TestTortureDiskFull fills a real, small file system (memory, in a name space
// of its own) with points: it ends with ErrFull, the last words are written
// into the reserve, and everything acknowledged is there.
func TestTortureDiskFull(t *testing.T) {
	child := exec.Command(os.Args[0])
	child.Env = append(os.Environ(), diskFolder+"="+t.TempDir())
	child.SysProcAttr = &syscall.SysProcAttr{
		Cloneflags:  syscall.CLONE_NEWUSER | syscall.CLONE_NEWNS,
		UidMappings: []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getuid(), Size: 1}},
		GidMappings: []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getgid(), Size: 1}},
	}
	if out, err := child.CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
}

// fillADisk is the child's part: it mounts 12 MiB at dir and fills them.
func fillADisk(dir string) error {
	if err := unix.Mount("none", dir, "tmpfs", 0, "size=12m"); err != nil {
		return fmt.Errorf("mount: %w", err)
	}
	ctx, path := context.Background(), filepath.Join(dir, "nightbench.db")
	s, err := Open(ctx, path, instruments.NewClock(1))
	if err != nil {
		return err
	}
	run, err := s.CreateRun(ctx, sampleRun())
	if err != nil {
		return err
	}
	kept := 0
	for ; err == nil; kept++ {
		_, err = s.Append(ctx, sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(kept)})
	}
	if kept--; !errors.Is(err, ErrFull) || kept < 100 {
		return fmt.Errorf("after %d points: %w", kept, err)
	}
	for _, e := range []sweeps.Entry{
		{Run: run.ID, Kind: sweeps.KindState, State: sweeps.MakingSafe, Words: "the journal can't be written"},
		{Run: run.ID, Kind: sweeps.KindOff, Off: &sweeps.Off{Confirmed: true, By: []string{"supply"}, Below: 0.5}},
		{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Failed, Words: "the disk is full"},
	} {
		if _, err := s.Append(ctx, e); err != nil {
			return fmt.Errorf("last word: %w", err)
		}
	}
	if err := s.Close(ctx); err != nil {
		return err
	}
	return standsAfterwards(ctx, path, run.ID, kept)
}

// standsAfterwards reads the store back without writing to the full disk.
func standsAfterwards(ctx context.Context, path string, run int64, kept int) error {
	s, err := OpenReader(ctx, path)
	if err != nil {
		return err
	}
	defer s.Close(ctx)
	r, err := s.Run(ctx, run)
	if err != nil {
		return err
	}
	points, err := s.Points(ctx, run)
	if err != nil {
		return err
	}
	var sound string
	if err := s.read.QueryRow(`PRAGMA integrity_check`).Scan(&sound); err != nil {
		return err
	}
	if sound != "ok" || r.State != sweeps.Failed || len(points) != kept {
		return fmt.Errorf("%s, run %s, %d points of %d", sound, r.State, len(points), kept)
	}
	return nil
}

// TestTortureKilled kills a writing process a hundred times at random instants.
func TestTortureKilled(t *testing.T) {
	dice := rand.New(rand.NewPCG(7, 7))
	killAgainAndAgain(t, 100, func(int) int { return 1 + dice.IntN(200) })
}
