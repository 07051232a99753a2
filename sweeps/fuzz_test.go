package sweeps_test

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightbench/instruments/bench"
	"nightbench/sweeps"
)

// FuzzPlan: whatever plan and board say, reading and checking end without a
// panic, and what passes can be stepped: finite values, rising, within the ratings.
func FuzzPlan(f *testing.F) {
	board, err := os.ReadFile("example/pump-driver-b.toml")
	if err != nil {
		f.Fatal(err)
	}
	for _, glob := range []string{"example/*.toml", "../testdata/bad/*.plan.toml", "../testdata/bad/*.board.toml"} {
		names, err := filepath.Glob(glob)
		if err != nil || len(names) == 0 {
			f.Fatalf("%s: %d files, %v", glob, len(names), err)
		}
		for _, name := range names {
			text, err := os.ReadFile(name)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(string(text), string(board))
			f.Add(string(text), string(text))
		}
	}
	b, err := bench.Read("example/bench.toml")
	if err != nil {
		f.Fatal(err)
	}
	f.Fuzz(func(t *testing.T, plan, board string) {
		p, bd, err := sweeps.ParseFiles(sweeps.File{Name: "plan.toml", Text: plan}, sweeps.File{Name: "board.toml", Text: board})
		if err == nil {
			err = sweeps.CheckPlan(p, bd, &b.Wiring)
		}
		if err != nil {
			if !strings.HasPrefix(err.Error(), "plan.toml") && !strings.HasPrefix(err.Error(), "board.toml") {
				t.Errorf("a mistake that names no file: %v", err)
			}
			return
		}
		for _, a := range p.Axes {
			for i, v := range a.Values {
				if math.IsNaN(v) || math.IsInf(v, 0) || i > 0 && v <= a.Values[i-1] || a.Set == sweeps.SetSupplyVoltage && v > b.Wiring.Supply.MaxVoltage {
					t.Errorf("axis %s has value %g at %d", a.Set, v, i)
				}
			}
		}
	})
}
