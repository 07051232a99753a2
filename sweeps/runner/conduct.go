package runner

import (
	"context"
	"errors"
	"fmt"
	"time"

	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/schedule"
)

// conduct goes through the plan. It returns the cause that ends the run.
func (r *Runner) conduct(ctx context.Context) error {
	first, ok := schedule.Next(r.order, r.points)
	if !ok {
		return errDone
	}
	if err := r.prepare(ctx, first); err != nil {
		return err
	}
	if err := r.energise(ctx, first); err != nil {
		return err
	}
	g := crew{cancel: r.cancel}
	timing, done := context.WithCancel(ctx)
	g.Go("time limit", func() { r.endInTime(timing) })
	defer g.wg.Wait()
	defer done()
	if err := r.warmUp(ctx); err != nil {
		return err
	}
	return r.steps(ctx)
}

// steps measures setpoint after setpoint.
func (r *Runner) steps(ctx context.Context) error {
	began, here := r.o.Clock.Now(), 0
	at := sweeps.Setpoint{Index: -1}
	for {
		next, ok := schedule.Next(r.order, r.points)
		if !ok {
			return errDone
		}
		if err := r.heldUp(ctx, next); err != nil {
			return err
		}
		p, err := r.visit(ctx, at, next)
		if err != nil {
			return err
		}
		if _, err := r.append(sweeps.Entry{Kind: sweeps.KindPoint, Point: &p}); err != nil {
			return &journalFailed{err}
		}
		r.points = append(r.points, p)
		here++
		at = next
		r.progress(began, here)
	}
}

// prepare sets everything that must hold before the output goes on, output off.
func (r *Runner) prepare(ctx context.Context, first sweeps.Setpoint) error {
	w := r.o.Bench.Wiring
	s, err := r.o.Bench.Supply.State(ctx)
	if err != nil {
		return fmt.Errorf("prepare: %w", err)
	}
	if s.Output {
		return errors.New("prepare: the supply's output is already on; switch it off and find out why before starting")
	}
	if err := r.o.Bench.Supply.Protect(ctx, si.Volts(w.Supply.OverVoltage)); err != nil {
		return fmt.Errorf("prepare: over-voltage: %w", err)
	}
	if err := r.o.Bench.Supply.SetCurrentLimit(ctx, si.Amperes(w.Supply.MaxCurrent)); err != nil {
		return fmt.Errorf("prepare: current limit: %w", err)
	}
	if w.Pot != nil {
		if err := r.o.Bench.Pot.SetCode(ctx, first.PotCode); err != nil {
			return fmt.Errorf("prepare: pot: %w", err)
		}
	}
	if err := r.o.Bench.Supply.SetVoltage(ctx, si.Volts(first.Supply)); err != nil {
		return fmt.Errorf("prepare: %w", err)
	}
	return r.setUpMeasuring(ctx, first)
}

// energise makes "about to energise" durable, in the journal and in a file, and only then switches on.
func (r *Runner) energise(ctx context.Context, at sweeps.Setpoint) error {
	w := r.o.Bench.Wiring.Supply
	words := fmt.Sprintf("Output on, %s; current limit %s, over-voltage %s.", Place(at), si.Amperes(w.MaxCurrent), si.Volts(w.OverVoltage))
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindEnergising, Words: words}); err != nil {
		return &journalFailed{err}
	}
	if err := r.o.Mark.Set(r.o.Run.ID); err != nil {
		return fmt.Errorf("the record that the bench is about to be energised can't be written: %w", err)
	}
	if err := context.Cause(ctx); err != nil {
		return err
	}
	r.setEnergised(sweeps.EnergisedYes, nil)
	if err := r.o.Bench.Supply.SetOutput(ctx, true); err != nil {
		return fmt.Errorf("energise: %w", err)
	}
	r.setState(sweeps.Running)
	return nil
}

// warmUp dwells at the plan's warm-up setting. A resumed run warms up again.
func (r *Runner) warmUp(ctx context.Context) error {
	wu := r.o.Plan.WarmUp
	if wu == nil {
		return nil
	}
	at, err := r.atHeld(wu.At)
	if err != nil {
		return err
	}
	if err := r.set(ctx, sweeps.Setpoint{Index: -1}, at); err != nil {
		return err
	}
	r.say(fmt.Sprintf("Warm-up %s at %s.", wu.For, Place(at)))
	r.doing("Warming up at "+Place(at), fmt.Sprintf("For %s before the first point.", wu.For))
	return r.o.Clock.Sleep(ctx, wu.For)
}

// atHeld is the setpoint of a warm-up's setting, the pot on the nearest code.
func (r *Runner) atHeld(h sweeps.Held) (sweeps.Setpoint, error) {
	s := sweeps.Setpoint{Index: -1, Supply: h.Supply.SI()}
	pot := r.o.Bench.Wiring.Pot
	if pot == nil {
		return s, nil
	}
	codes, err := schedule.Codes(sweeps.Axis{Set: sweeps.SetPotResistance, Values: []float64{h.Pot.SI()}}, pot)
	if err != nil {
		return s, err
	}
	s.PotCode, s.Pot = codes[0], pot.Ohms(codes[0]).SI()
	return s, nil
}

// endInTime ends the run so that the bench is safe by the plan's limit.
func (r *Runner) endInTime(ctx context.Context) {
	left, why := r.timeLimit()
	if left == 0 {
		<-ctx.Done()
		return
	}
	by := r.o.Clock.Now().Add(left)
	r.tell(func(v *sweeps.Vitals) { v.SafeBy = &by })
	if r.o.Clock.Wait(ctx, left-min(safeMargin, left/10)) == nil {
		r.cancel(&Stop{Reason: why})
	}
}

// safeMargin of wall time is kept for making safe before a plan's limit.
const safeMargin = 30 * time.Second

// timeLimit is the wall time the plan leaves, and the reason it will give; 0 is no limit.
func (r *Runner) timeLimit() (left time.Duration, why string) {
	p := r.o.Plan
	if p.AtMost > 0 {
		left = time.Duration(float64(p.AtMost) / r.o.Clock.Pace())
		why = fmt.Sprintf("the plan's limit of %s was reached", p.AtMost)
	}
	if !r.o.SafeBy.IsZero() {
		if d := r.o.SafeBy.Sub(r.o.Clock.Now()); left == 0 || d < left {
			left, why = max(d, time.Millisecond), "the plan's limit, safe by "+p.SafeBy+", was reached"
		}
	}
	return left, why
}

// Place names a setpoint for people: "9 V, 22 k".
func Place(s sweeps.Setpoint) string {
	v := si.Format(s.Supply, si.Volt)
	if s.Pot == 0 {
		return v
	}
	return v + ", " + si.Short(s.Pot)
}
