package app

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"nightbench/daemon/store"
	"nightbench/daemon/web"
	"nightbench/instruments/userfile"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
	"nightbench/sweeps/predict"
)

// ourPump is a user's own motor, as the example board has it, with what its maker rates it for.
const ourPump = `[[motor]]
name = "dosing pump"
resistance = { typical = 12, low = 10.8, high = 13.2 }
inductance = { typical = 5e-3 }
torque_constant = { typical = 8e-3 }
coulomb_torque = { typical = 0.4e-3 }
viscous_torque = { typical = 0.2e-6 }
inertia = { typical = 5e-7 }
max_current = { typical = 1.2, source = "the maker's sheet" }
`

// pumpByName is the example board whose load is that motor.
func pumpByName() string {
	head, _, _ := strings.Cut(example.Text(example.BoardPump), "[load]")
	return head + "[load]\nkind = \"motor\"\npart = \"dosing pump\"\n"
}

// A run keeps the parts files of its board, and what it is resumed from and the
// view Boards compute from the copies is what the files on disk give.
func TestRunKeepsItsPartsFiles(t *testing.T) {
	n := night{
		board: pumpByName(), beside: map[string]string{"ours.parts.toml": ourPump}, pace: 100, seed: 5,
		plan: onePlan("9 V", `"10k"`, `"duty", "average_voltage", "motor_current"`, "average_voltage"),
	}
	run, points := n.run(t)
	kept := sweeps.PartsOf(run.Files)
	if len(kept) != 1 || kept[0].Name != "ours.parts.toml" || kept[0].Text != ourPump || kept[0].SHA256 != hashOf(ourPump) {
		t.Fatalf("kept %+v", kept)
	}
	band := points[0].Predictions[sweeps.MotorCurrent]
	if got, u := value(t, points[0], sweeps.MotorCurrent); got < band.Low-2*u || got > band.High+2*u {
		t.Errorf("motor current %g A, predicted %+v", got, band)
	}
	_, board, err := filesOf(run)
	if err != nil {
		t.Fatal(err)
	}
	p, err := newPredictor(board, exampleWiring(t), predict.Reference, uint64(run.Seed))
	if err != nil {
		t.Fatal(err)
	}
	again, _ := p.At(9, points[0].Setpoint.Pot)
	if want := again[sweeps.MotorCurrent].Value; want == 0 || band.Value < 0.98*want || band.Value > 1.02*want { // its supply was measured, not 9 V to the last digit
		t.Errorf("motor current %g A, from the copies %g A", band.Value, want)
	}
	d, err := newBoards(oneRun{run}).Board(t.Context(), hashOf(pumpByName()), web.BoardAsked{Supply: 9, Pot: 10e3, Temperature: 27})
	if err != nil {
		t.Fatal(err)
	}
	alone, err := predict.New(board, AloneOptions(board, nil))
	if err != nil {
		t.Fatal(err)
	}
	want, err := alone.At(predict.Setting{Supply: 9, Pot: 10e3, Temperature: 27})
	if err != nil {
		t.Fatal(err)
	}
	if got := d.Values[sweeps.MotorCurrent].Value; got != want.Values[sweeps.MotorCurrent] {
		t.Errorf("Boards has %g A, the files %g A", got, want.Values[sweeps.MotorCurrent])
	}
}

// oneRun is the journal of a single run.
type oneRun struct{ run sweeps.Run }

func (o oneRun) BoardFiles(context.Context) ([]store.BoardFile, error) {
	i := slices.IndexFunc(o.run.Files, func(f sweeps.File) bool { return f.Role == "board" })
	return []store.BoardFile{{Run: o.run.ID, Name: o.run.Files[i].Name, SHA256: o.run.Files[i].SHA256}}, nil
}

func (o oneRun) Runs(context.Context) ([]sweeps.Run, error)     { return []sweeps.Run{o.run}, nil }
func (o oneRun) Run(context.Context, int64) (sweeps.Run, error) { return o.run, nil }
func (o oneRun) Plan(context.Context, int64) ([]sweeps.Setpoint, []sweeps.Curve, error) {
	return nil, nil, nil
}

// A rating of the user's part refuses the plan, in rehearsal as at the start; a mistake
// in it is told with file, line and key.
func TestOwnPartsInRehearsal(t *testing.T) {
	rehearse := func(parts string) error {
		dir := t.TempDir()
		for name, text := range map[string]string{"board.toml": pumpByName(), "ours.parts.toml": parts, "plan.toml": onePlan("9 V", `"1k"`, `"duty"`, "average_voltage")} {
			if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
				t.Fatal(err)
			}
		}
		plan, board, err := sweeps.ReadPlan(filepath.Join(dir, "plan.toml"))
		if err != nil {
			t.Fatal(err)
		}
		w := exampleWiring(t)
		_, err = Rehearse(plan, board, &w)
		return err
	}
	if err := rehearse(ourPump); err != nil {
		t.Errorf("within its ratings: %v", err)
	}
	weak := strings.Replace(ourPump, "typical = 1.2", "typical = 0.1", 1)
	if err := rehearse(weak); err == nil || !strings.Contains(err.Error(), "the plan is refused: ") || !strings.Contains(err.Error(), "rotor held, motor: mean current") {
		t.Errorf("above its rating: %v", err)
	}
	var e *userfile.Error
	if err := rehearse(strings.Replace(ourPump, "typical = 8e-3", "typcial = 8e-3", 1)); !errors.As(err, &e) || filepath.Base(e.File) != "ours.parts.toml" || e.Line != 5 || e.Key != "motor[1].torque_constant.typcial" {
		t.Errorf("a misspelt key: %v", err)
	}
}
