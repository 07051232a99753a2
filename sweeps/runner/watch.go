package runner

import (
	"context"
	"fmt"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Wall times: they guard a real link and are never paced.
const (
	watchEvery = 500 * time.Millisecond // supply state at 2 Hz
	blindAfter = 2 * time.Second        // no good supply state for this long while energised is a trip
	// limitingFor is how long the supply may be in current limit before it counts
	// as a trip: a motor's inrush is over by then. Bench time; common practice, no source.
	limitingFor = 3 * time.Second
)

// watch looks at the supply for as long as the run lasts and trips on what it sees.
func (r *Runner) watch(ctx context.Context) {
	var limitingSince time.Duration
	for {
		s, err := r.o.Bench.Supply.State(ctx)
		if err == nil {
			r.sawSupply(s)
			limitingSince = r.judge(s, limitingSince)
		}
		wait := watchEvery
		if d, ok := r.limits.pending(r.o.Clock.Elapsed()); ok {
			wait = min(wait, time.Duration(float64(d)/r.o.Clock.Pace()))
		}
		if r.o.Clock.Wait(ctx, wait) != nil {
			return
		}
	}
}

// judge trips on a supply state; it returns since when the supply has been limiting, 0 when it isn't.
func (r *Runner) judge(s instruments.SupplyState, limitingSince time.Duration) time.Duration {
	now := r.o.Clock.Elapsed()
	r.check(sweeps.SupplyCurrent, s.Current, now)
	r.check(sweeps.SupplyVoltage, s.Voltage, now)
	if r.energised() == sweeps.EnergisedYes && s.Tripped {
		r.cancel(&Trip{Reason: "the supply's own protection tripped and holds the output off", Raw: s.Voltage.Raw + "; " + s.Current.Raw})
	}
	if !s.Limiting || !s.Output {
		return 0
	}
	if limitingSince == 0 {
		return now
	}
	if now-limitingSince > limitingFor {
		r.cancel(&Trip{Reason: fmt.Sprintf("the supply has been in current limit for more than %s: a short, a stalled motor, or a limit set too low", limitingFor), Raw: s.Current.Raw})
	}
	return limitingSince
}

// check holds one reading against the plan's limits.
func (r *Runner) check(q sweeps.Quantity, s instruments.Sample, at time.Duration) {
	if s.Outcome == instruments.Overload && r.limits.has(q) {
		r.cancel(&Trip{Reason: fmt.Sprintf("%s overloads its range of %g %s", q, s.Range, s.Unit), Raw: s.Raw})
		return
	}
	if s.Outcome != instruments.Measured {
		return
	}
	if t := r.limits.observe(q, s.Value, s.Raw, at); t != nil {
		r.cancel(t)
	}
}

// guardBlind trips when no good supply state came for blindAfter while energised.
func (r *Runner) guardBlind(ctx context.Context) {
	for r.o.Clock.Wait(ctx, blindAfter/8) == nil {
		if r.energised() != sweeps.EnergisedYes {
			continue
		}
		if age := r.supplyAge(); age > blindAfter {
			r.cancel(&Trip{Reason: fmt.Sprintf("blind: no good supply state for %.1f s while energised", age.Seconds())})
		}
	}
}
