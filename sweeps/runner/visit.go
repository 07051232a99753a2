package runner

import (
	"context"
	"fmt"
	"time"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/derive"
)

// visit sets a setpoint coming from another, lets it settle, measures it and
// derives its point.
func (r *Runner) visit(ctx context.Context, from, to sweeps.Setpoint) (sweeps.Point, error) {
	if r.holding() {
		return sweeps.Point{}, errHold
	}
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
	ohms := si.Format(s.Pot, si.Ohm)
	if s.Position > 0 {
		ohms += " of the track charging"
	}
	switch s.Direction {
	case sweeps.Up, sweeps.Down:
		return fmt.Sprintf("Going %s, code %d, %s.", s.Direction, s.PotCode, ohms)
	}
	return fmt.Sprintf("Code %d, %s.", s.PotCode, ohms)
}

// set brings the bench from one setpoint to another. Only what differs is told.
func (r *Runner) set(ctx context.Context, from, to sweeps.Setpoint) error {
	if err := r.feed(ctx, from, to); err != nil {
		return err
	}
	if r.o.Bench.Wiring.Pot == nil || from.PotCode == to.PotCode {
		return nil
	}
	return r.again(ctx, 0, func(ctx context.Context) error { return r.o.Bench.Pot.SetCode(ctx, to.PotCode) })
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

// A lost instrument gets one retry of a second (wall), beyond what the reading itself takes.
const (
	retryAfter  = 200 * time.Millisecond
	retryWithin = time.Second
)

// again tries f, and once more after a moment where it failed. A failure that the
// second try mended is written down. takes is the bench time f needs by itself, s.
func (r *Runner) again(ctx context.Context, takes float64, f func(context.Context) error) error {
	first := f(ctx)
	if first == nil || ctx.Err() != nil {
		return first
	}
	if r.o.Clock.Wait(ctx, retryAfter) != nil {
		return first
	}
	ctx, cancel := context.WithTimeout(ctx, retryWithin+r.wall(seconds(takes)))
	defer cancel()
	if second := f(ctx); second != nil {
		return fmt.Errorf("%w; tried once more: %w", first, second)
	}
	r.say(fmt.Sprintf("%v. The second try went well.", first))
	return nil
}
