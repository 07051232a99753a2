package app

import (
	"context"
	"fmt"
	"math"
	"time"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

// Resume goes on with an interrupted or stopped run, from the files as they were when it began.
func (d *Daemon) Resume(ctx context.Context, id int64, operator string) (sweeps.Run, error) {
	old, err := d.store.Run(ctx, id)
	if err != nil {
		return sweeps.Run{}, err
	}
	if !old.State.Ended() || old.State == sweeps.Done {
		return sweeps.Run{}, conflict("run %d is %s: only an interrupted, stopped, tripped or failed run can be resumed", id, old.State)
	}
	plan, board, err := filesOf(old)
	if err != nil {
		return sweeps.Run{}, err
	}
	job, err := d.job(plan, board, uint64(old.Seed))
	if err != nil {
		return sweeps.Run{}, err
	}
	if err := d.sofar(ctx, id, &job); err != nil {
		return sweeps.Run{}, err
	}
	if _, left := schedule.Next(job.Order, job.Done); !left {
		return sweeps.Run{}, conflict("run %d has all its %d points: nothing is left to measure", id, len(job.Done))
	}
	old.Planned = len(job.Order)
	open := func() (sweeps.Run, error) {
		_, err := d.store.Append(ctx, sweeps.Entry{Run: id, Elapsed: job.Before.Seconds(), Kind: sweeps.KindState, State: sweeps.Preparing})
		old.State = sweeps.Preparing
		return old, err
	}
	return d.begin(ctx, job, open, fmt.Sprintf("Resumed%s at point %d of %d.", by(operator), len(job.Done)+1, len(job.Order))+whoAttends(plan)+saidAmbient(plan))
}

// sofar gives a resumed run its points and its time, and refuses it where the bench
// of today would go to other setpoints than those it was begun with.
func (d *Daemon) sofar(ctx context.Context, id int64, job *runner.Options) error {
	begun, _, err := d.store.Plan(ctx, id)
	if err != nil {
		return err
	}
	if err := sameOrder(begun, job.Order); err != nil {
		return conflict("run %d can't go on: %s", id, err)
	}
	if job.Done, err = d.store.Points(ctx, id); err != nil {
		return err
	}
	log, err := d.store.Log(ctx, id)
	job.Before = elapsed(job.Done, log)
	return err
}

// sameOrder refuses another order of visit than the one a run was begun with: done
// points are known by their index alone. Plan, board and seed are the run's own, so what
// differs comes of the bench's pot. begun is empty where the run never came to be announced.
func sameOrder(begun, now []sweeps.Setpoint) error {
	const try = "give the bench file its [pot] as it was (the run keeps a copy), or start the plan anew on this bench"
	if len(begun) == 0 {
		return nil
	}
	for i := range min(len(begun), len(now)) {
		if what, was, is := departure(begun[i], now[i]); what != "" {
			return fmt.Errorf("setpoint %d was begun with %s %s, and this bench would give it %s: %s", i+1, what, was, is, try)
		}
	}
	if len(begun) != len(now) {
		return fmt.Errorf("it was begun with %d setpoints, and this bench would give it %d: %s", len(begun), len(now), try)
	}
	return nil
}

// departure is the first setting in which two setpoints differ, and both values; empty where none does.
func departure(begun, now sweeps.Setpoint) (what, was, is string) {
	ohms := func(s sweeps.Setpoint) string {
		return fmt.Sprintf("%.6g\u00a0Ω (code %d)", s.Pot, s.PotCode)
	}
	switch {
	case !alike(begun.Supply, now.Supply):
		return "supply_voltage", si.Format(begun.Supply, si.Volt), si.Format(now.Supply, si.Volt)
	case !alike(begun.Position, now.Position):
		return "pot_position", si.Percent(begun.Position), si.Percent(now.Position)
	case begun.PotCode != now.PotCode || !alike(begun.Pot, now.Pot):
		return "pot_resistance", ohms(begun), ohms(now)
	case begun.Direction != now.Direction || begun.Pass != now.Pass:
		return "direction", fmt.Sprintf("%q in pass %d", begun.Direction, begun.Pass+1), fmt.Sprintf("%q in pass %d", now.Direction, now.Pass+1)
	case begun.Index != now.Index || begun.Recheck != now.Recheck:
		return "place", fmt.Sprintf("%d (recheck: %t)", begun.Index, begun.Recheck), fmt.Sprintf("%d (recheck: %t)", now.Index, now.Recheck)
	}
	return "", "", ""
}

// alike allows for the last digits, which may differ between two builds.
func alike(a, b float64) bool { return math.Abs(a-b) <= 1e-9*math.Max(math.Abs(a), math.Abs(b)) }

// elapsed is the bench time since a run began, as far as its journal tells.
func elapsed(points []sweeps.Point, log []sweeps.Entry) time.Duration {
	most := 0.0
	for _, p := range points {
		most = max(most, p.Elapsed)
	}
	for _, e := range log {
		most = max(most, e.Elapsed)
	}
	return time.Duration(most * float64(time.Second))
}
