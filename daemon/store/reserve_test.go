package store

import (
	"errors"
	"fmt"
	"os"
	"testing"

	"nightbench/sweeps"
)

// fillDisk makes the store's file unable to grow until the reserve is released.
// SQLite reports its own page limit and a full disk by the same code (SQLITE_FULL, sqlite.org/rescode.html#full).
func fillDisk(t *testing.T, s *Store) {
	t.Helper()
	var pages int
	if err := s.write.QueryRow(`PRAGMA page_count`).Scan(&pages); err != nil {
		t.Fatal(err)
	}
	limit := func(n int) {
		if err := s.write.QueryRow(fmt.Sprintf(`PRAGMA max_page_count = %d`, n)).Scan(&n); err != nil {
			t.Error(err)
		}
	}
	limit(pages)
	free := s.reserve.free
	s.reserve.free = func() error {
		err := free()
		if err == nil {
			limit(pages + reserveSize/4096)
		}
		return err
	}
}

// TestLastWordsOnAFullDisk: points stop with ErrFull; off and ended still get written; what was there stays.
func TestLastWordsOnAFullDisk(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	fillDisk(t, s)
	kept := 0
	var err error
	for i := 0; err == nil && i < 1000; i++ {
		if _, err = s.Append(t.Context(), sweeps.Entry{Run: run.ID, Kind: sweeps.KindPoint, Point: samplePoint(i)}); err == nil {
			kept++
		}
	}
	if !errors.Is(err, ErrFull) {
		t.Fatalf("after %d points: %v", kept, err)
	}
	words := make([]byte, 8192) // too long for what is left of a page
	for i := range words {
		words[i] = 'w'
	}
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: run.ID, Kind: sweeps.KindLog, Words: string(words)}); !errors.Is(err, ErrFull) {
		t.Errorf("a log entry took the reserve: %v", err)
	}
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindOff, Words: string(words), Off: &sweeps.Off{Confirmed: true, By: []string{"supply"}, Below: 0.5}})
	mustAppend(t, s, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Failed, Words: "the disk is full"})
	if _, err := os.Stat(s.reserve.path); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("the reserve was not given up: %v", err)
	}
	r, err := s.Run(t.Context(), run.ID)
	if err != nil || r.State != sweeps.Failed || r.Measured != kept {
		t.Errorf("%+v %v, want %d points", r, err, kept)
	}
	s.Close(t.Context())
	again := openAt(t, s.path)
	if i, err := os.Stat(again.reserve.path); err != nil || i.Size() != reserveSize {
		t.Errorf("the reserve is not there again: %v", err)
	}
}

func TestNoReserveLeft(t *testing.T) {
	s := openStore(t)
	run := mustRun(t, s)
	fillDisk(t, s)
	os.Remove(s.reserve.path)
	words := make([]byte, 1<<17)
	for i := range words {
		words[i] = 'w'
	}
	if _, err := s.Append(t.Context(), sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Failed, Words: string(words)}); !errors.Is(err, ErrFull) {
		t.Errorf("got %v", err)
	}
}
