package runner

import (
	"context"
	"fmt"
	"sync"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// Wall times: they guard a real link and are never paced.
const (
	watchEvery = 500 * time.Millisecond // supply state at 2 Hz
	blindAfter = 2 * time.Second        // no good supply state for this long while energised is a trip
)

// A strain on the supply has to last, in bench time and in looks at it, before
// it counts: a motor's inrush is over by then. Common practice, no source.
const (
	strainFor   = 3 * time.Second
	strainLooks = 3
)

// latched is the reason of a protection of the supply's own.
const latched = "the supply's own protection tripped and holds the output off; find out why before clearing it"

// watch looks at the supply for as long as the run lasts and trips on what it sees.
func (r *Runner) watch(ctx context.Context) {
	for {
		// A look that fails is not the end yet: guardBlind counts from the last good one.
		if _, err := r.look(ctx); err != nil && ctx.Err() == nil {
			r.o.Log.Warn("the supply's state could not be read", "run", r.o.Run.ID, "err", err)
		}
		wait := watchEvery
		if d, ok := r.limits.pending(r.o.Clock.Elapsed()); ok {
			wait = min(wait, max(r.wall(d), time.Millisecond))
		}
		if r.strain.any() {
			wait = min(wait, r.wall(strainFor/4))
		}
		if r.o.Clock.Wait(ctx, wait) != nil {
			return
		}
	}
}

// heldOff tells whether the run is held, its output confirmed off.
func (r *Runner) heldOff() bool {
	r.mu.Lock()
	defer r.mu.Unlock()
	return r.state == sweeps.HeldState && r.vitals.Energised == sweeps.EnergisedNo
}

// look reads the supply's state and judges it. Whoever reads it reads it here.
func (r *Runner) look(ctx context.Context) (instruments.SupplyState, error) {
	before, held := r.driving(), r.heldOff()
	s, err := r.o.Bench.Supply.State(ctx)
	if err != nil {
		return s, err
	}
	if s.Voltage.Outcome == instruments.Measured && s.Current.Outcome == instruments.Measured {
		r.sawSupply(s)
	}
	now := r.o.Clock.Elapsed()
	r.check(sweeps.SupplyCurrent, s.Current, now)
	r.check(sweeps.SupplyVoltage, s.Voltage, now)
	raw := s.Voltage.Raw + "; " + s.Current.Raw
	if r.energised() != sweeps.EnergisedYes {
		if s.Output && held && r.heldOff() {
			r.setEnergised(sweeps.EnergisedYes, nil)
			r.cancel(&Trip{Reason: "the supply's output went on while the run was held: switched on at its panel, or by another program", Raw: raw})
		}
		return s, nil
	}
	if s.Tripped {
		r.cancel(&Trip{Reason: latched, Raw: raw})
	}
	if why := r.strain.limiting.see(now, s.Limiting && s.Output, &r.strain.mu); why {
		r.cancel(&Trip{Reason: fmt.Sprintf("limiting: the supply has been in current limit for more than %s: a short, a stalled motor, or a limit set too low", strainFor), Raw: raw})
	}
	if d := r.driving(); d.on && d == before {
		r.compare(s, d, now)
	}
	return s, nil
}

// compare holds a state against what the run has the supply do.
func (r *Runner) compare(s instruments.SupplyState, d drive, now time.Duration) {
	if !s.Output {
		r.cancel(&Trip{Reason: "the supply's output went off by itself: switched off at its panel, or it lost power meanwhile", Raw: s.Voltage.Raw})
		return
	}
	off := s.Voltage.Outcome == instruments.Measured && !onTarget(s.Voltage, d.volts)
	if r.strain.astray.see(now, off, &r.strain.mu) {
		r.cancel(&Trip{Raw: s.Voltage.Raw, Reason: fmt.Sprintf("supply off target: set to %s, it reads %s for more than %s",
			si.Volts(d.volts), si.Format(s.Voltage.Value, si.Volt), strainFor)})
	}
}

// strain is what the supply may suffer for a moment and no longer.
type strain struct {
	mu               sync.Mutex // guards both
	limiting, astray lasting
}

// any tells whether something is being waited out.
func (s *strain) any() bool {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.limiting.looks > 0 || s.astray.looks > 0
}

// lasting is a condition seen without a break: since when, and in how many looks.
type lasting struct {
	since time.Duration
	looks int
}

// see takes one look; true when the condition has lasted too long.
func (l *lasting) see(now time.Duration, yes bool, mu *sync.Mutex) bool {
	mu.Lock()
	defer mu.Unlock()
	if !yes {
		*l = lasting{}
		return false
	}
	if l.looks++; l.looks == 1 {
		l.since = now
	}
	return l.looks >= strainLooks && now-l.since >= strainFor
}

// check holds one reading against the plan's limits.
func (r *Runner) check(q sweeps.Quantity, s instruments.Sample, at time.Duration) {
	if s.Outcome == instruments.Overload && r.limits.has(q) {
		r.cancel(&Trip{Reason: fmt.Sprintf("%s overloads its range of %s", q, si.Format(s.Range, s.Unit)), Raw: s.Raw})
		return
	}
	if s.Outcome != instruments.Measured {
		return
	}
	if t := r.limits.observe(q, s.Value, s.Raw, at, seconds(s.Aperture)); t != nil {
		r.cancel(t)
	}
}

// guardBlind trips when no good supply state came for blindAfter while energised.
func (r *Runner) guardBlind(ctx context.Context) {
	for {
		wait := blindAfter
		if r.energised() == sweeps.EnergisedYes {
			age := r.supplyAge()
			if age >= blindAfter {
				r.cancel(blind(age))
				return
			}
			wait -= age
		}
		if r.o.Clock.Wait(ctx, wait) != nil {
			return
		}
	}
}
