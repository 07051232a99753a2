package app

import (
	"math"
	"strings"
	"testing"

	"nightbench/sweeps"
	"nightbench/sweeps/example"
	"nightbench/sweeps/predict"
)

// examplePlan reads a plan on the example board; more is added to its head.
func examplePlan(t *testing.T, more string) (sweeps.Plan, sweeps.Board) {
	t.Helper()
	text := strings.Replace(onePlan("9 V", `"10k"`, `"duty", "t_high"`, "average_voltage"), "board = \"board.toml\"\n", "board = \"board.toml\"\n"+more, 1)
	plan, board, err := sweeps.ParseFiles(sweeps.File{Name: "plan.toml", Text: text}, sweeps.File{Name: "board.toml", Text: example.Text(example.BoardPump)})
	if err != nil {
		t.Fatal(err)
	}
	return plan, board
}

// A plan's ambient is what is predicted for, with or without a bench; a diode's
// drop falls as it warms, so that phases shorten.
func TestRehearsalAtThePlansAmbient(t *testing.T) {
	w := exampleWiring(t)
	high := map[string]float64{}
	for more, celsius := range map[string]float64{"": predict.Reference, "ambient = \"5 degC\"\n": 5, "ambient = \"50 degC\"\n": 50} {
		plan, board := examplePlan(t, more)
		r, err := Rehearse(plan, board, &w)
		if err != nil {
			t.Fatal(err)
		}
		p, err := newPredictor(board, w, celsius, 1)
		if err != nil {
			t.Fatal(err)
		}
		s := r.Setpoints[0]
		want, _ := p.ensemble.At(predict.Setting{Supply: 9, Pot: s.Pot, Temperature: celsius, Burden: Burden(w)})
		if got := s.Predictions[sweeps.THigh]; r.Ambient != celsius || got != want[sweeps.THigh] {
			t.Errorf("%q: at %g °C t_high %+v, want %+v", more, r.Ambient, got, want[sweeps.THigh])
		}
		high[more] = s.Predictions[sweeps.THigh].Value
	}
	if !(high["ambient = \"5 degC\"\n"] > high[""] && high[""] > high["ambient = \"50 degC\"\n"]) {
		t.Errorf("t_high %v", high)
	}
}

// A run is predicted for its plan's ambient and says so; its curves and its points agree.
func TestRunAtThePlansAmbient(t *testing.T) {
	plan, board := examplePlan(t, "ambient = \"45 degC\"\n")
	run, points := night{board: board.Text, plan: plan.Text, pace: 100, seed: 3}.run(t)
	if got, want := AmbientOf(run), "Ambient 45\u00a0°C, as the plan says."; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	p, err := newPredictor(board, exampleWiring(t), 45, uint64(run.Seed))
	if err != nil {
		t.Fatal(err)
	}
	supply, _ := points[0].Reading(sweeps.SupplyVoltage)
	at := points[0].Setpoint.Supply
	if supply.Value != nil {
		at = *supply.Value
	}
	want, _ := p.At(at, points[0].Setpoint.Pot)
	cold, _ := p.ensemble.At(predict.Setting{Supply: at, Pot: points[0].Setpoint.Pot, Temperature: predict.Reference, Burden: p.burden})
	got := points[0].Predictions[sweeps.THigh].Value
	if warm := want[sweeps.THigh].Value; math.Abs(got-warm) > 0.1*math.Abs(warm-cold[sweeps.THigh].Value) {
		t.Errorf("t_high predicted %g s, at 45 °C it is %g s, at 27 °C %g s", got, warm, cold[sweeps.THigh].Value)
	}
}

func TestAmbientInWords(t *testing.T) {
	plan, _ := examplePlan(t, "")
	if got := saidAmbient(plan); got != " Ambient not measured: 27\u00a0°C assumed." {
		t.Errorf("%q", got)
	}
	plan, _ = examplePlan(t, "ambient = \"22 degC\"\n")
	if got := saidAmbient(plan); got != " Ambient 22\u00a0°C, as the plan says." {
		t.Errorf("%q", got)
	}
	if got := AmbientOf(sweeps.Run{}); got != "" {
		t.Errorf("of a run without files: %q", got)
	}
}
