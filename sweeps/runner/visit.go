package runner

import (
	"context"
	"fmt"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/derive"
)

// visit sets a setpoint coming from another, lets it settle, measures it and
// derives its point.
func (r *Runner) visit(ctx context.Context, from, to sweeps.Setpoint) (sweeps.Point, error) {
	r.tell(func(v *sweeps.Vitals) { v.Setpoint, v.Repeat = &to, 0 })
	r.doing("Settling at "+Place(to), travel(to))
	if err := r.set(ctx, from, to); err != nil {
		return sweeps.Point{}, err
	}
	if err := r.setUpMeasuring(ctx, to); err != nil {
		return sweeps.Point{}, err
	}
	unsettled, err := r.settle(ctx)
	if err != nil {
		return sweeps.Point{}, err
	}
	r.doing("Measuring at "+Place(to), travel(to))
	raw, err := r.measure(ctx, to)
	if err != nil {
		return sweeps.Point{}, err
	}
	return r.point(to, raw, unsettled), nil
}

// travel is the sentence about where the run comes from.
func travel(s sweeps.Setpoint) string {
	words := fmt.Sprintf("Code %d, %s.", s.PotCode, si.Format(s.Pot, si.Ohm))
	switch s.Direction {
	case sweeps.Up, sweeps.Down:
		return fmt.Sprintf("Going %s, code %d, %s.", s.Direction, s.PotCode, si.Format(s.Pot, si.Ohm))
	}
	return words
}

// set brings the bench from one setpoint to another. Only what differs is told.
func (r *Runner) set(ctx context.Context, from, to sweeps.Setpoint) error {
	if from.Index < 0 || from.Supply != to.Supply {
		if err := r.o.Bench.Supply.SetVoltage(ctx, si.Volts(to.Supply)); err != nil {
			return err
		}
		if from.Index >= 0 {
			r.say("Supply to " + si.Format(to.Supply, si.Volt) + ".")
		}
	}
	if r.o.Bench.Wiring.Pot != nil && (from.Index < 0 || from.PotCode != to.PotCode) {
		return again(ctx, r.o.Clock, func() error { return r.o.Bench.Pot.SetCode(ctx, to.PotCode) })
	}
	return nil
}

// point turns what was measured into a point: readings, predictions at the measured supply, flags.
func (r *Runner) point(at sweeps.Setpoint, raw derive.Raw, unsettled *sweeps.Flag) sweeps.Point {
	readings := derive.Readings(r.o.Bench.Wiring, r.o.Board, raw, r.o.Plan.Measure.Quantities)
	if unsettled != nil {
		for i := range readings {
			readings[i].Flags = append(readings[i].Flags, *unsettled)
		}
	}
	predictions, flags := r.o.Predict.At(raw.SupplyVoltage(), at.Pot)
	p := sweeps.Point{
		Setpoint: at, At: r.o.Clock.Now(), Elapsed: (r.o.Clock.Elapsed() - r.begun).Seconds(),
		Readings: readings, Predictions: predictions, Flags: flags,
	}
	if keep := r.o.Plan.Measure.KeepWaveform; keep > 0 && at.Index%keep == 0 {
		p.Records = raw.Kept(r.o.Bench.Wiring)
	}
	return p
}

// again tries f, and once more after a moment where it failed: a lost instrument
// gets one retry of a second, no more.
func again(ctx context.Context, clock instruments.Clock, f func() error) error {
	err := f()
	if err == nil || ctx.Err() != nil {
		return err
	}
	if clock.Wait(ctx, 200*time.Millisecond) != nil {
		return err
	}
	return f()
}
