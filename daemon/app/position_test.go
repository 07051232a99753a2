package app

import (
	"context"
	"math"
	"os"
	"slices"
	"strings"
	"testing"

	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/sweeps"
	"nightbench/sweeps/example"
	"nightbench/sweeps/predict"
)

// wiperBoard is the text of a board with both ends of the bench's pot in its timing network.
func wiperBoard(t *testing.T) string {
	t.Helper()
	text, err := os.ReadFile("../../testdata/wiper.board.toml")
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// positionPlan steps the given shares of the track at 9 V.
func positionPlan(shares, quantities string) string {
	return strings.Replace(onePlan("9 V", shares, quantities, "average_voltage"), "pot_resistance", "pot_position", 1)
}

// A specimen drawn from a seed, its track up to 20 % off: the measured duty follows the
// share of the track that charges, lies in its band, and the frequency hardly moves.
func TestDutyFollowsThePosition(t *testing.T) {
	board, _, _ := strings.Cut(wiperBoard(t), "[load]")
	board += "[load]\nkind = \"resistor\"\nresistance = \"100 5%\"\n" // a motor at a tenth of full duty stutters, which costs time
	n := night{board: board, seed: 7, pace: 100, plan: positionPlan(`0.1, "35 %", 0.7, 0.95`, `"duty", "frequency", "pot_resistance"`)}
	n.plan += "[warm_up]\nfor = \"5 s\"\nat = { supply_voltage = \"9 V\", pot_position = 0.5 }\n"
	run, points := n.run(t)
	if len(points) != 4 || run.Planned != 4 {
		t.Fatalf("%d points of %d", len(points), run.Planned)
	}
	last := 0.0
	for i, p := range points {
		code := []int{230, 166, 77, 13}[i] // (1 − x)·256, rounded by hand
		if x := 1 - float64(code)/256; p.Setpoint.PotCode != code || p.Setpoint.Position != x || p.Setpoint.Pot != x*100e3 {
			t.Errorf("point %d stands at %+v", i, p.Setpoint)
		}
		if r, _ := value(t, p, sweeps.PotResistance); math.Abs(r-p.Setpoint.Pot) > 1e-6 {
			t.Errorf("point %d: %g Ω charge, %g Ω by the code", i, r, p.Setpoint.Pot)
		}
		for _, q := range []sweeps.Quantity{sweeps.Duty, sweeps.Frequency} {
			got, u := value(t, p, q)
			band := p.Predictions[q]
			t.Logf("%.1f %%: %s %.4g (u %.2g), predicted %.4g [%.4g to %.4g]", 100*p.Setpoint.Position, q, got, u, band.Value, band.Low, band.High)
			if got < band.Low-2*u || got > band.High+2*u {
				t.Errorf("at %g of the track %s is %g, predicted %g to %g", p.Setpoint.Position, q, got, band.Low, band.High)
			}
		}
		duty, _ := value(t, p, sweeps.Duty)
		if duty <= last {
			t.Errorf("the duty went from %g to %g as the share rose", last, duty)
		}
		last = duty
	}
}

// Ideal timing: ideal timer, near-ideal diodes, t = ln 2·R·C a phase (data sheet SLFS022,
// section 8.3.2, the exact constant), no load to move the supply, R by the sum of what the phase's current passes:
// the charging resistor, the wiper and the share of a 100 k track to end A; and the
// wiper and the rest to end B.
func TestIdealTimingOfAPosition(t *testing.T) {
	board := timerAlone("ideal", "4k7", "4k7", "22n", `{ is = 1e-12, n = 0.001, rs = 0 }`)
	board = strings.NewReplacer(`"steered"`, `"wiper"`, `discharge = "pot"`, `pot = "pot"`, "stop =", "stop_down = \"4k7\"\nstop_up =").Replace(board)
	n := night{board: board, pace: 100, plan: positionPlan(`0.25, 0.95`, `"t_high", "t_low"`)}
	_, points := n.run(t)
	for _, p := range points {
		x := p.Setpoint.Position
		for q, ohms := range map[sweeps.Quantity]float64{sweeps.THigh: 4.7e3 + 75 + x*100e3 + 4.7e3, sweeps.TLow: 75 + (1-x)*100e3 + 4.7e3} {
			got, u := value(t, p, q)
			if want := math.Ln2 * ohms * 22e-9; math.Abs(got-want) > 3*u+1e-3*want {
				t.Errorf("at %g of the track %s is %.6g s (u %.2g), ln 2·R·C gives %.6g", x, q, got, u, want)
			}
		}
	}
}

// exampleWiring is the example bench's.
func exampleWiring(t *testing.T) instruments.Wiring {
	t.Helper()
	f, err := bench.Parse("bench.toml", example.Text(example.Bench))
	if err != nil {
		t.Fatal(err)
	}
	return f.Wiring
}

// wiperPlan reads a plan on the wiper board.
func wiperPlan(t *testing.T, shares string) (sweeps.Plan, sweeps.Board) {
	t.Helper()
	plan, board, err := sweeps.ParseFiles(sweeps.File{Name: "plan.toml", Text: positionPlan(shares, `"duty"`)}, sweeps.File{Name: "board.toml", Text: wiperBoard(t)})
	if err != nil {
		t.Fatal(err)
	}
	return plan, board
}

func TestRehearsalOfPositions(t *testing.T) {
	plan, board := wiperPlan(t, "0.05, 0.35, 0.95")
	w := exampleWiring(t)
	r, err := Rehearse(plan, board, &w)
	if err != nil {
		t.Fatal(err)
	}
	var places []string
	for _, s := range r.Setpoints {
		places = append(places, s.Place)
	}
	if want := []string{"9\u00a0V, 5.08\u00a0%", "9\u00a0V, 35.2\u00a0%", "9\u00a0V, 94.9\u00a0%"}; !slices.Equal(places, want) {
		t.Errorf("places %q", places)
	}
	// Without the bench nobody knows how long the track is: no figure is made up.
	if _, err := Rehearse(plan, board, nil); err == nil || !strings.Contains(err.Error(), "ohms end to end are not known here; name the bench file") {
		t.Errorf("without a bench: %v", err)
	}
	w.Pot.MaxCurrent = 0.5e-3 // 6 V less a diode through 4.7 k and the last of the track is more
	if _, err := Rehearse(plan, board, &w); err == nil || !strings.Contains(err.Error(), "the plan is refused: 9\u00a0V, 94.9\u00a0%: pot: wiper current") {
		t.Errorf("above the pot's current: %v", err)
	}
}

// A run's curves are drawn along ohms, and pass through the setpoints' own predictions.
func TestCurvesOfAPositionRunAlongOhms(t *testing.T) {
	_, board := wiperPlan(t, "0.5")
	p, err := newPredictor(board, exampleWiring(t), predict.Reference, 1)
	if err != nil {
		t.Fatal(err)
	}
	curves := p.Curves([]sweeps.Setpoint{{Supply: 9, Pot: 5e3, Position: 0.05}, {Supply: 9, Pot: 95e3, Position: 0.95}})
	c := curves[0]
	if len(curves) != 1 || len(c.Pot) != 49 || c.Pot[0] != 5e3 || c.Pot[48] != 95e3 {
		t.Fatalf("%d curves, %v", len(curves), c.Pot)
	}
	at, _ := p.At(9, 95e3)
	if d := c.Quantities[sweeps.Duty]; *d.Value[48] != at[sweeps.Duty].Value || *d.High[48] != at[sweeps.Duty].High || !(*d.Value[0] < *d.Value[48]) {
		t.Errorf("the curve ends at a duty of %g, the setpoint has %g", *d.Value[48], at[sweeps.Duty].Value)
	}
}

// benched is runs that kept the example bench's file.
type benched struct{ drawer }

func (b benched) Run(ctx context.Context, id int64) (sweeps.Run, error) {
	r, err := b.drawer.Run(ctx, id)
	r.Files = append(r.Files, sweeps.File{Role: "bench", Name: "bench.toml", Text: example.Text(example.Bench)})
	return r, err
}

// The view Boards takes the track from the run's copy of its bench file; without one it says what is missing.
func TestBoardOfAPosition(t *testing.T) {
	text := wiperBoard(t)
	from := drawer{[]string{text}, []sweeps.Setpoint{{Supply: 9, Pot: 35e3, Position: 0.35}}}
	asked := web.BoardAsked{Supply: 9, Pot: 0.35, Temperature: 27}
	d, err := newBoards(benched{from}).Board(t.Context(), hashOf(text), asked)
	if err != nil {
		t.Fatal(err)
	}
	board, err := sweeps.ParseBoard(sweeps.File{Name: "board.toml", Text: strings.Replace(text, `pot = "pot"`, `pot = "100k 20%"`, 1)})
	if err != nil {
		t.Fatal(err)
	}
	m, err := predict.New(board, predict.Options{WiperResistance: 75})
	if err != nil {
		t.Fatal(err)
	}
	same, err := m.At(predict.Setting{Supply: 9, Pot: 0.35, Temperature: 27})
	if err != nil {
		t.Fatal(err)
	}
	if got, want := d.Values[sweeps.Duty].Value, same.Values[sweeps.Duty]; d.Along != "pot_position" || math.Abs(got-want) > 1e-12 {
		t.Errorf("along %s: duty %g, with the same track written into the board %g", d.Along, got, want)
	}
	if _, err := newBoards(from).Board(t.Context(), hashOf(text), asked); err == nil || !strings.Contains(err.Error(), "not known here") {
		t.Errorf("without the bench's file: %v", err)
	}
}
