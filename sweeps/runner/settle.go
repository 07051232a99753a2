package runner

import (
	"context"
	"fmt"
	"math"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"

	"golang.org/x/sync/errgroup"
)

// Settling: over the last max(5 readings, 3 τ) |slope| × window below steady, the
// standard error below a third of it, and not before 5 τ. τ is the largest of the
// board's and the supply's (common practice, no source).
const (
	leastReadings = 5
	supplyTau     = 0.02 // s, output capacitor of a small bench supply: common practice, no source
)

// settle watches the plan's quantity until it holds still. A setpoint that does
// not settle in time is measured all the same and flagged.
func (r *Runner) settle(ctx context.Context) (*sweeps.Flag, error) {
	rule := r.o.Plan.Settle
	meter, ok := r.meterFor(rule.Watch)
	if !ok {
		return nil, fmt.Errorf("settle: no meter of this bench reads %q; add one, or watch another quantity", rule.Watch)
	}
	tau := math.Max(r.o.Predict.Tau(), supplyTau)
	begun := r.o.Clock.Elapsed()
	s := settling{least: leastReadings}
	if r.o.Clock.Pace() > 1 {
		s.least *= 3 // a sped-up practice bench on a busy computer gets to say something before the limit counts
	}
	for {
		if r.holding() {
			return nil, errHold
		}
		sample, err := r.readAll(ctx, meter)
		if err != nil {
			return nil, err
		}
		elapsed := (r.o.Clock.Elapsed() - begun).Seconds()
		s.tries++
		if sample.Outcome == instruments.Measured {
			s.add(elapsed, sample.Value)
		}
		if elapsed > 5*tau && s.steady(3*tau, rule.Steady, r.floor(sample)) {
			return nil, nil
		}
		if elapsed > rule.AtMost.Seconds() && s.tries >= s.least {
			return s.flag(rule, 3*tau), nil
		}
	}
}

// floor is the least change worth calling one: twice what the meter can resolve.
func (r *Runner) floor(s instruments.Sample) float64 {
	return 2 * (s.Accuracy.Resolution + s.Accuracy.Range*s.Range)
}

// settling is the readings of one setpoint: instants (s) and values. A verdict
// "unsettled" is fair only after the least number of tries, however slow the meter.
type settling struct {
	at, value    []float64
	tries, least int
}

func (s *settling) add(at, value float64) {
	s.at, s.value = append(s.at, at), append(s.value, value)
}

// window is the index of the first reading of the last max(5 readings, span s).
func (s *settling) window(span float64) int {
	n := len(s.at)
	first := n - leastReadings
	for first > 0 && s.at[n-1]-s.at[first] < span {
		first--
	}
	return first
}

// drift is |slope|·window and the standard error of the mean about the line.
func (s *settling) drift(span float64) (drift, se, mean float64, ok bool) {
	first := s.window(span)
	if first < 0 {
		return 0, 0, 0, false
	}
	at, value := s.at[first:], s.value[first:]
	if !(at[len(at)-1] > at[0]) {
		return 0, 0, 0, false
	}
	n := float64(len(at))
	var mt, mv, stt, stv, svv float64
	for i := range at {
		mt += at[i] / n
		mv += value[i] / n
	}
	for i := range at {
		dt, dv := at[i]-mt, value[i]-mv
		stt += dt * dt
		stv += dt * dv
		svv += dv * dv
	}
	slope := stv / stt
	rest := math.Max(svv-slope*stv, 0)
	return math.Abs(slope) * (at[len(at)-1] - at[0]), math.Sqrt(rest / (n - 2) / n), mv, true
}

func (s *settling) steady(span, rel, floor float64) bool {
	drift, se, mean, ok := s.drift(span)
	limit := math.Max(rel*math.Abs(mean), floor)
	return ok && drift < limit && se < limit/3
}

func (s *settling) flag(rule sweeps.Settle, span float64) *sweeps.Flag {
	drift, _, mean, ok := s.drift(span)
	words := fmt.Sprintf("not settled after %s", rule.AtMost)
	if len(s.at) == 0 {
		words += fmt.Sprintf(": the meter of %s gave no value", rule.Watch)
	}
	if ok && mean != 0 {
		words += fmt.Sprintf(": %s still moved by %s; %.3g %% is asked", rule.Watch, si.Format(100*drift/math.Abs(mean), si.One)+" %", 100*rule.Steady)
	}
	return &sweeps.Flag{Name: "unsettled", Words: words}
}

// readAll reads, side by side, the meter asked for and every one whose quantity
// the plan limits; it answers the one asked for. A meter below 0 asks for none.
func (r *Runner) readAll(ctx context.Context, meter int) (s instruments.Sample, err error) {
	g, ctx := errgroup.WithContext(ctx)
	for i, m := range r.o.Bench.Wiring.Meters {
		if i != meter && !r.limits.has(sweeps.Quantity(m.Reads)) {
			continue
		}
		g.Go(func() error {
			return guard("meter "+m.Name, func() error {
				x, err := r.read(ctx, i)
				if i == meter {
					s = x
				}
				return err
			})
		})
	}
	return s, cause(ctx, g.Wait())
}

// read takes one reading of a meter and holds it against the limits.
func (r *Runner) read(ctx context.Context, meter int) (s instruments.Sample, err error) {
	err = r.again(ctx, r.takes.reading, func(ctx context.Context) error {
		s, err = r.o.Bench.Meters[meter].Read(ctx)
		return err
	})
	if err == nil {
		r.check(sweeps.Quantity(r.o.Bench.Wiring.Meters[meter].Reads), s, r.o.Clock.Elapsed())
	}
	return s, err
}

// meterFor is the index of the meter that reads q.
func (r *Runner) meterFor(q sweeps.Quantity) (int, bool) {
	for i, m := range r.o.Bench.Wiring.Meters {
		if sweeps.Quantity(m.Reads) == q {
			return i, true
		}
	}
	return 0, false
}

// seconds turns s into a duration.
func seconds(s float64) time.Duration { return time.Duration(s * float64(time.Second)) }
