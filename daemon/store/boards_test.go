package store

import (
	"testing"

	"github.com/google/go-cmp/cmp"

	"nightbench/sweeps"
)

func TestBoardFiles(t *testing.T) {
	s := openStore(t)
	if fs, err := s.BoardFiles(t.Context()); err != nil || len(fs) != 0 {
		t.Fatalf("of no run: %v, %v", fs, err)
	}
	for _, sum := range []string{"01", "02"} {
		r := sampleRun()
		r.Files[1].SHA256 = sum
		r, err := s.CreateRun(t.Context(), r)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := s.Append(t.Context(), sweeps.Entry{Run: r.ID, Kind: sweeps.KindEnded, State: sweeps.Stopped}); err != nil {
			t.Fatal(err)
		}
	}
	fs, err := s.BoardFiles(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff([]BoardFile{{2, "board.toml", "02"}, {1, "board.toml", "01"}}, fs); d != "" {
		t.Error(d)
	}
}
