package runner

import (
	"context"
	"math/rand/v2"

	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/derive"

	"golang.org/x/sync/errgroup"
)

// measure takes all repeats of a setpoint, every instrument in a goroutine of its
// own. A hold ends it after the readings in hand, with errHold unless they were the last.
func (r *Runner) measure(ctx context.Context, at sweeps.Setpoint) (derive.Raw, error) {
	raw := derive.Raw{Setpoint: at, Meters: make([][]instruments.Sample, len(r.o.Bench.Meters))}
	period := r.expect(at).period
	g, ctx := errgroup.WithContext(ctx)
	each := func(where string, take func() error) {
		g.Go(func() error {
			return guard(where, func() error { return r.repeat(ctx, period, take) })
		})
	}
	each("supply", func() error {
		return r.again(ctx, 0, func(ctx context.Context) error {
			s, err := r.look(ctx)
			if err == nil {
				raw.Supply = append(raw.Supply, s)
			}
			return err
		})
	})
	for i := range r.o.Bench.Meters {
		each(r.o.Bench.Wiring.Meters[i].Name, func() error {
			s, err := r.read(ctx, i)
			if err == nil {
				raw.Meters[i] = append(raw.Meters[i], s)
				r.repeated(i, len(raw.Meters[i]))
			}
			return err
		})
	}
	if r.o.Bench.Wiring.Scope != nil {
		each("scope", func() error { return r.capture(ctx, &raw) })
	}
	err := cause(ctx, g.Wait())
	if err == nil && !r.complete(raw) {
		err = errHold
	}
	return raw, err
}

// cause is why a group of readings ended: an error that is only the consequence of another gives way to it.
func cause(ctx context.Context, err error) error {
	if err == nil {
		return nil
	}
	if why := context.Cause(ctx); why != nil {
		return why
	}
	return err
}

// repeated shows how far the first meter has come.
func (r *Runner) repeated(meter, n int) {
	if meter == 0 {
		r.tell(func(v *sweeps.Vitals) { v.Repeat = n })
	}
}

// complete tells whether every instrument gave all its repeats.
func (r *Runner) complete(raw derive.Raw) bool {
	n := r.o.Plan.Measure.Repeats
	if len(raw.Supply) < n || r.o.Bench.Wiring.Scope != nil && len(raw.Records) < n {
		return false
	}
	for _, m := range raw.Meters {
		if len(m) < n {
			return false
		}
	}
	return true
}

// repeat takes the plan's repeats, each begun at a random fraction of the period: begun in
// step with the wave they would beat with it and their scatter would lie.
func (r *Runner) repeat(ctx context.Context, period float64, take func() error) error {
	for range r.o.Plan.Measure.Repeats {
		if r.holding() {
			return nil
		}
		if err := r.o.Clock.Sleep(ctx, seconds(rand.Float64()*period)); err != nil {
			return err
		}
		if err := take(); err != nil {
			return err
		}
	}
	return nil
}

func (r *Runner) capture(ctx context.Context, raw *derive.Raw) error {
	return r.again(ctx, r.takes.record, func(ctx context.Context) error {
		f, err := r.o.Bench.Scope.Capture(ctx)
		if err == nil {
			raw.Records = append(raw.Records, f)
		}
		return err
	})
}
