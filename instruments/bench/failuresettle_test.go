package bench

import (
	"context"
	"log/slog"
	"math"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

const settlingPlan = `[plan]
name = "One point"
board = "board.toml"
at_most = "1 h"
[[axis]]
set = "supply_voltage"
values = ["9 V"]
[[axis]]
set = "pot_resistance"
values = ["10k"]
[settle]
watch = "average_voltage"
steady = "1 %"
at_most = "60 s"
[measure]
quantities = ["average_voltage"]
repeats = 4
[trip]
supply_current = { limit = "0.9 A", for = "200 ms" }
`

const settlingBoard = `[board]
name = "Dosing pump driver"
revision = "B"
rated_supply = ["4.5 V", "12 V"]
[timer]
part = "bipolar"
[timing]
network = "steered"
charge = "10k 1%"
discharge = "pot"
stop = "470 1%"
capacitor = "100n 5%"
charge_diode = "1N4148"
discharge_diode = "1N4148"
[driver]
stage = "nmos"
part = { rds_on = 0.05, vgs_th = 1.5 }
gate_resistor = "100 5%"
flyback = "none"
[load]
kind = "resistor"
resistance = "100"
`

// journal keeps what a run writes; it is its mark of being energised too.
type journal []sweeps.Entry

func (j *journal) Append(_ context.Context, e sweeps.Entry) (sweeps.Entry, error) {
	*j = append(*j, e)
	return e, nil
}
func (*journal) Set(int64) error { return nil }
func (*journal) Clear() error    { return nil }

// nothing predicts nothing but how long to wait.
type nothing struct{}

func (nothing) At(_, _ float64) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag) {
	return nil, nil
}
func (nothing) Curves([]sweeps.Setpoint) []sweeps.Curve { return nil }
func (nothing) Tau() float64                            { return 0.1 }
func (nothing) Peak(float64) float64                    { return 0.2 }

// unsettled: the source creeps to 4 V with a time constant of 3 s, or never
// comes to rest. A run measures the one when it holds still, and flags the other.
func unsettled(t *testing.T) {
	for name, c := range map[string]struct {
		volts   func(s float64) float64
		flagged bool
	}{
		"Creeping":  {func(s float64) float64 { return 4 * (1 - math.Exp(-s/3)) }, false},
		"Wandering": {func(s float64) float64 { return s / 20 }, true},
	} {
		w := newWired()
		b := opened(t, w, file(t), 1)
		done := make(chan struct{})
		ctx, stop := context.WithCancel(t.Context())
		go func() {
			defer close(done)
			for begun := time.Now(); ctx.Err() == nil; time.Sleep(10 * time.Millisecond) {
				if !w.supply.On() {
					begun = time.Now()
				}
				w.meter.Input(c.volts(time.Since(begun).Seconds()), 0)
			}
		}()
		r := func() sweeps.Point {
			defer func() { stop(); <-done }()
			return runOnce(t, b)
		}()
		var flags []sweeps.Flag
		v := math.NaN()
		if reading, ok := r.Reading(sweeps.AverageVoltage); ok && reading.Value != nil {
			v, flags = *reading.Value, append(reading.Flags, r.Flags...)
		}
		flagged := false
		for _, f := range flags {
			flagged = flagged || f.Name == "unsettled"
		}
		if flagged != c.flagged || !c.flagged && math.Abs(v-4) > 0.04 {
			t.Errorf("%s: %g V, flags %+v", name, v, flags)
		}
	}
}

// runOnce conducts a run of one point and gives it.
func runOnce(t *testing.T, b *Opened) (p sweeps.Point) {
	t.Helper()
	plan, board, err := sweeps.ParseFiles(sweeps.File{Name: "plan.toml", Text: settlingPlan}, sweeps.File{Name: "board.toml", Text: settlingBoard})
	must(t, err)
	must(t, sweeps.CheckPlan(plan, board, &b.Wiring))
	order, err := schedule.Order(plan, b.Wiring.Pot, 1)
	must(t, err)
	kept := &journal{}
	last, giveUp := context.WithTimeout(context.Background(), 10*time.Minute)
	defer giveUp()
	end := runner.New(runner.Options{Bench: b.Bench, Clock: instruments.NewClock(1), Journal: kept, Mark: kept, Predict: nothing{}, Board: board, Plan: plan,
		Run: sweeps.Run{ID: 1, Planned: 1, Quantities: plan.Measure.Quantities}, Order: order, Safe: instruments.SafeSpec{Below: si.Volts(0.5)},
		Log: slog.New(slog.DiscardHandler)}).Conduct(t.Context(), last)
	if end.State != sweeps.Done {
		t.Errorf("the run ended %s: %s", end.State, end.Reason)
	}
	for _, e := range *kept {
		if e.Point != nil {
			p = *e.Point
		}
	}
	return p
}
