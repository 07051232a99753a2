package app

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightbench/daemon/store"
	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

// orderOn is the order of visit of a small plan on a bench with this pot.
func orderOn(t *testing.T, pot instruments.PotWiring) []sweeps.Setpoint {
	t.Helper()
	plan := sweeps.Plan{Axes: []sweeps.Axis{
		{Set: sweeps.SetSupplyVoltage, Values: []float64{9, 12}},
		{Set: sweeps.SetPotResistance, Values: []float64{5e3, 22e3}, Direction: sweeps.Up},
	}}
	order, err := schedule.Order(plan, &pot, 1)
	if err != nil {
		t.Fatal(err)
	}
	return order
}

var benchPot = instruments.PotWiring{Codes: 257, EndToEnd: 100e3, Wiper: 75}

// A run is not resumed on a bench whose pot would be set to something else: its done
// points would be taken for those of other ohms.
func TestResumeOnAnotherPotIsRefused(t *testing.T) {
	begun := orderOn(t, benchPot)
	if err := sameOrder(begun, orderOn(t, benchPot)); err != nil {
		t.Errorf("the same bench: %v", err)
	}
	if err := sameOrder(nil, begun); err != nil {
		t.Errorf("a run that never came to be announced: %v", err)
	}
	fewer, longer, wiper := benchPot, benchPot, benchPot
	fewer.Codes, longer.EndToEnd, wiper.Wiper = 129, 110e3, 125
	for name, pot := range map[string]instruments.PotWiring{"fewer codes": fewer, "longer track": longer, "another wiper": wiper} {
		err := sameOrder(begun, orderOn(t, pot))
		if err == nil {
			t.Errorf("%s: nothing is said", name)
			continue
		}
		for _, want := range []string{"setpoint 1", "pot_resistance", "(code ", "[pot] as it was", "start the plan anew"} {
			if !strings.Contains(err.Error(), want) {
				t.Errorf("%s: %q does not say %q", name, err, want)
			}
		}
	}
	if err := sameOrder(begun, begun[:3]); err == nil || !strings.Contains(err.Error(), "with 4 setpoints") {
		t.Errorf("one setpoint fewer: %v", err)
	}
	for what, spoil := range map[string]func(*sweeps.Setpoint){
		"supply_voltage": func(s *sweeps.Setpoint) { s.Supply += 0.1 },
		"pot_position":   func(s *sweeps.Setpoint) { s.Position += 0.1 },
		"direction":      func(s *sweeps.Setpoint) { s.Direction = sweeps.Down },
		"place":          func(s *sweeps.Setpoint) { s.Recheck = true },
	} {
		other := orderOn(t, benchPot)
		spoil(&other[2])
		if err := sameOrder(begun, other); err == nil || !strings.Contains(err.Error(), "setpoint 3 was begun with "+what) {
			t.Errorf("%s: %v", what, err)
		}
	}
}

// What a resumed run goes on from is what the journal tells: its points, its time, its order.
func TestResumeTakesPointsAndTimeFromTheJournal(t *testing.T) {
	ctx := t.Context()
	s, err := store.Open(ctx, filepath.Join(t.TempDir(), "nightbench.db"), instruments.NewClock(1))
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close(ctx)
	order := orderOn(t, benchPot)
	run, err := s.CreateRun(ctx, sweeps.Run{State: sweeps.Preparing, StartedAt: time.Now(), Planned: len(order), Pace: 1})
	if err != nil {
		t.Fatal(err)
	}
	point := sweeps.Point{Setpoint: order[0], At: time.Now(), Elapsed: 30, Readings: []sweeps.Reading{}, Flags: []sweeps.Flag{}}
	for _, e := range []sweeps.Entry{
		{Kind: sweeps.KindStarted, Setpoints: order},
		{Kind: sweeps.KindPoint, Elapsed: 30.5, Point: &point},
		{Kind: sweeps.KindLog, Words: "Supply to 12 V.", Elapsed: 42},
		{Kind: sweeps.KindEnded, State: sweeps.Interrupted}, // by the next daemon, which knows no time of the run
	} {
		e.Run = run.ID
		if _, err := s.Append(ctx, e); err != nil {
			t.Fatal(err)
		}
	}
	d := &Daemon{store: s}
	job := runner.Options{Order: order}
	if err := d.sofar(ctx, run.ID, &job); err != nil {
		t.Fatal(err)
	}
	if len(job.Done) != 1 || job.Before != 42*time.Second {
		t.Errorf("%d points, %s since it began; want 1 and 42 s", len(job.Done), job.Before)
	}
	longer := benchPot
	longer.EndToEnd = 110e3
	job = runner.Options{Order: orderOn(t, longer)}
	if err := d.sofar(ctx, run.ID, &job); err == nil || !strings.Contains(err.Error(), "run 1 can't go on: setpoint 1") {
		t.Errorf("on another bench: %v", err)
	}
}
