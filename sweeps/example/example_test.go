package example_test

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"nightbench/instruments/bench"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
)

// written is a folder with the example files.
func written(t *testing.T) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "new")
	if err := example.Write(dir); err != nil {
		t.Fatal(err)
	}
	return dir
}

func TestEveryPlanFitsTheBench(t *testing.T) {
	dir := written(t)
	b, err := bench.Read(filepath.Join(dir, example.Bench))
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{example.Sample, example.Overnight} {
		plan, board, err := sweeps.ReadPlan(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		if err := sweeps.CheckPlan(plan, board, &b.Wiring); err != nil {
			t.Error(err)
		}
		if err := sweeps.CheckPlan(plan, board, nil); err != nil {
			t.Errorf("without a bench: %v", err)
		}
	}
	if _, err := sweeps.ReadBoard(filepath.Join(dir, example.BoardPlain)); err != nil {
		t.Error(err)
	}
}

func TestSampleIsTheDemonstration(t *testing.T) {
	plan, board, err := sweeps.ReadPlan(filepath.Join(written(t), example.Sample))
	if err != nil {
		t.Fatal(err)
	}
	if len(plan.Axes) != 2 || len(plan.Axes[0].Values) < 2 || len(plan.Axes[1].Values) < 12 || plan.Axes[1].Direction != sweeps.Both {
		t.Errorf("axes %+v, want two supplies, twelve pot settings, both directions", plan.Axes)
	}
	if plan.Measure.Repeats < 5 || plan.WarmUp != nil {
		t.Errorf("repeats %d, warm-up %v; want 5 or more and none", plan.Measure.Repeats, plan.WarmUp)
	}
	for _, q := range []sweeps.Quantity{sweeps.Duty, sweeps.Frequency, sweeps.AverageVoltage, sweeps.OutputDrop, sweeps.MotorCurrent, sweeps.SupplyCurrent} {
		if !slices.Contains(plan.Measure.Quantities, q) {
			t.Errorf("%s is not measured", q)
		}
	}
	if board.Load.Kind != sweeps.Motor || board.Driver.Stage != sweeps.StageNMOS || board.Timing.Network != sweeps.Steered {
		t.Errorf("board %+v", board)
	}
}

func TestWriteOverwritesNothing(t *testing.T) {
	dir := t.TempDir()
	mine := filepath.Join(dir, example.Sample)
	if err := os.WriteFile(mine, []byte("mine"), 0o644); err != nil {
		t.Fatal(err)
	}
	err := example.Write(dir)
	if err == nil || !strings.Contains(err.Error(), mine) {
		t.Fatalf("got %v, want an error that names %s", err, mine)
	}
	if text, _ := os.ReadFile(mine); string(text) != "mine" {
		t.Errorf("the file now holds %q", text)
	}
	if _, err := os.Stat(filepath.Join(dir, example.Bench)); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("another file was written all the same: %v", err)
	}
}

func TestWriteTellsWhyItCannot(t *testing.T) {
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o644); err != nil {
		t.Fatal(err)
	}
	if err := example.Write(filepath.Join(file, "below")); err == nil {
		t.Error("wrote below a file")
	}
}

func TestTextIsWhatIsWritten(t *testing.T) {
	dir := written(t)
	if len(example.Names()) != 5 {
		t.Errorf("names %v, want five", example.Names())
	}
	for _, name := range example.Names() {
		got, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil || string(got) != example.Text(name) || len(got) == 0 {
			t.Errorf("%s: %d bytes, %v", name, len(got), err)
		}
	}
	if example.Text("no-such.toml") != "" {
		t.Error("text of a file that isn't there")
	}
	if _, err := fs.Stat(example.FS(), example.Bench); err != nil {
		t.Error(err)
	}
}
