package runner

import (
	"context"
	"errors"
	"fmt"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/schedule"
)

// conduct goes through the plan. It returns the cause that ends the run.
func (r *Runner) conduct(ctx context.Context) error {
	next, ok := schedule.Next(r.order, r.points)
	if !ok {
		return errDone
	}
	at, err := r.begin(ctx, next, r.o.Plan.WarmUp != nil)
	if err != nil {
		return err
	}
	return r.steps(ctx, at)
}

// steps measures setpoint after setpoint; at is where the bench stands.
func (r *Runner) steps(ctx context.Context, at sweeps.Setpoint) error {
	began, here := r.o.Clock.Now(), 0
	for {
		next, ok := schedule.Next(r.order, r.points)
		if !ok {
			return errDone
		}
		p, err := r.visit(ctx, at, next)
		if errors.Is(err, errHold) {
			if at, err = r.afterHold(ctx, next, false); err != nil {
				return err
			}
			continue
		}
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

// begin energises and brings the bench to where next is visited from. It answers where the bench stands.
func (r *Runner) begin(ctx context.Context, next sweeps.Setpoint, warm bool) (at sweeps.Setpoint, err error) {
	at = r.before(next)
	if warm {
		if at, err = r.atHeld(r.o.Plan.WarmUp.At); err != nil {
			return at, err
		}
	}
	if err := r.prepare(ctx, at); err != nil {
		return at, err
	}
	if err := r.energise(ctx, at); err != nil {
		return at, err
	}
	switch {
	case warm:
		err = r.warmUp(ctx, at)
	case at != next:
		r.doing("Returning to "+Place(at), "The point before, so that the next one is reached from the same side.")
		_, err = r.settle(ctx)
	}
	if errors.Is(err, errHold) {
		return r.afterHold(ctx, next, warm)
	}
	return at, err
}

// afterHold waits a hold out and begins anew; a warm-up that was held is made in full.
func (r *Runner) afterHold(ctx context.Context, next sweeps.Setpoint, warm bool) (sweeps.Setpoint, error) {
	if err := r.heldUp(ctx, next); err != nil {
		return next, err
	}
	return r.begin(ctx, next, warm)
}

// before is the setpoint from which next is reached: the one measured last, so
// that a run held or resumed returns from the same side.
func (r *Runner) before(next sweeps.Setpoint) sweeps.Setpoint {
	if n := len(r.points); n > 0 {
		return r.points[n-1].Setpoint
	}
	return next
}

// prepare sets everything that must hold before the output goes on, output off.
func (r *Runner) prepare(ctx context.Context, at sweeps.Setpoint) error {
	w := r.o.Bench.Wiring
	s, err := r.o.Bench.Supply.State(ctx)
	if err != nil {
		return fmt.Errorf("prepare: %w", err)
	}
	if s.Output {
		r.setEnergised(sweeps.EnergisedYes, nil)
		return errors.New("prepare: the supply's output was on already, and not by this run; it is being switched off: find out who feeds the board before starting again")
	}
	r.limit = 0 // somebody may have been at the panel: told and read back anew
	if err := r.protect(ctx, si.Volts(w.Supply.OverVoltage)); err != nil {
		return err
	}
	if err := r.limitTo(ctx, r.currentLimit(at)); err != nil {
		return fmt.Errorf("prepare: %w", err)
	}
	if w.Pot != nil {
		if err := r.again(ctx, 0, func(ctx context.Context) error { return r.o.Bench.Pot.SetCode(ctx, at.PotCode) }); err != nil {
			return fmt.Errorf("prepare: pot: %w", err)
		}
	}
	if err := r.o.Bench.Supply.SetVoltage(ctx, si.Volts(at.Supply)); err != nil {
		return fmt.Errorf("prepare: %w", err)
	}
	return r.setUpMeasuring(ctx, at)
}

// protect sets the supply's own over-voltage level. A supply that can't be told one
// is used only where somebody attends, and the log says so.
func (r *Runner) protect(ctx context.Context, v si.Voltage) error {
	err := r.o.Bench.Supply.Protect(ctx, v)
	switch {
	case err == nil:
		return nil
	case !errors.Is(err, instruments.ErrCannot):
		return fmt.Errorf("prepare: over-voltage: %w", err)
	case r.o.Plan.Attended == "":
		return fmt.Errorf("prepare: this supply can't be told an over-voltage level, so somebody has to attend: set it at the front panel and add to [plan] who and until when, like attended = \"AK until 18:00\": %w", err)
	}
	r.say(fmt.Sprintf("This supply can't be told an over-voltage level: %s has to be set at its front panel by who attends.", v))
	return nil
}

// energise makes "about to energise" durable, in the journal and in a file, and only then switches on.
func (r *Runner) energise(ctx context.Context, at sweeps.Setpoint) error {
	words := fmt.Sprintf("Output on, %s; current limit %s, over-voltage %s.", Place(at), si.Amperes(r.limit), si.Volts(r.o.Bench.Wiring.Supply.OverVoltage))
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindEnergising, Words: words}); err != nil {
		return &journalFailed{err}
	}
	if err := r.o.Mark.Set(r.o.Run.ID); err != nil {
		return fmt.Errorf("the record that the bench is about to be energised can't be written: %w", err)
	}
	if err := context.Cause(ctx); err != nil {
		return err
	}
	r.setFeeding(true)
	if err := r.feedCutoff(ctx); err != nil {
		return fmt.Errorf("energise: cutoff: %w", err)
	}
	r.setEnergised(sweeps.EnergisedYes, nil)
	if err := r.o.Bench.Supply.SetOutput(ctx, true); err != nil {
		return fmt.Errorf("energise: %w", err)
	}
	r.setState(sweeps.Running)
	return r.arrive(ctx, at.Supply)
}

// warmUp dwells at the plan's warm-up setting, watching what the plan limits.
func (r *Runner) warmUp(ctx context.Context, at sweeps.Setpoint) error {
	d := r.o.Plan.WarmUp.For
	r.say(fmt.Sprintf("Warm-up %s at %s.", d, Place(at)))
	r.doing("Warming up at "+Place(at), fmt.Sprintf("For %s before the first point.", d))
	for until := r.o.Clock.Elapsed() + d; r.o.Clock.Elapsed() < until; {
		if r.holding() {
			return errHold
		}
		if _, err := r.readAll(ctx, -1); err != nil {
			return err
		}
		if err := r.o.Clock.Sleep(ctx, min(time.Second, until-r.o.Clock.Elapsed())); err != nil {
			return err
		}
	}
	return nil
}

// atHeld is the setpoint of a warm-up's setting, the pot on the nearest code.
func (r *Runner) atHeld(h sweeps.Held) (sweeps.Setpoint, error) {
	s := sweeps.Setpoint{Index: -1, Supply: h.Supply.SI()}
	pot := r.o.Bench.Wiring.Pot
	if pot == nil {
		return s, nil
	}
	a := sweeps.Axis{Set: sweeps.SetPotResistance, Values: []float64{h.Pot.SI()}}
	if x := h.Position.SI(); x > 0 {
		a = sweeps.Axis{Set: sweeps.SetPotPosition, Values: []float64{x}}
	}
	codes, err := schedule.Codes(a, pot)
	if err != nil {
		return s, err
	}
	s.Turn(*pot, codes[0], a.Set)
	return s, nil
}

// Place names a setpoint for people: "9 V, 22 k", or with the pot's wiper in the timing network "9 V, 35 %".
func Place(s sweeps.Setpoint) string {
	v := si.Format(s.Supply, si.Volt)
	switch {
	case s.Position > 0:
		return v + ", " + si.Percent(s.Position)
	case s.Pot == 0:
		return v
	}
	return v + ", " + si.Short(s.Pot)
}
