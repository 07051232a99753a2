package runner

import (
	"context"
	"fmt"
	"math"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// drive is what the run has the supply do. Every change of it is another one, so
// that a state asked for before and read after is held against neither.
type drive struct {
	on    bool
	volts float64
	turn  int
}

// drives says what the supply is to do from now on.
func (r *Runner) drives(d drive) {
	r.mu.Lock()
	defer r.mu.Unlock()
	d.turn = r.drive.turn + 1
	r.drive = d
}

func (r *Runner) driving() drive {
	r.mu.Lock()
	defer r.mu.Unlock()
	return r.drive
}

// The supply's own limit, per setpoint: this much above the highest current
// predicted, which is a locked rotor's (every start is one) beside what the board
// itself takes. Within the bench's own limit, always.
const (
	limitShare = 1.3
	ownCurrent = 50e-3 // A, at the least for timer and network: a limit below it would starve the board's capacitors. Common practice, no source
	limitStep  = 1e-3  // A, rounded up to
)

// currentLimit is the supply's limit at a setpoint, A.
func (r *Runner) currentLimit(at sweeps.Setpoint) float64 {
	own := ownCurrent
	if p, ok := r.predicted(at)[sweeps.SupplyCurrent]; ok && p.High > own {
		own = p.High
	}
	a := math.Ceil(limitShare*(r.o.Predict.Peak(at.Supply)+own)/limitStep) * limitStep
	if most := r.o.Bench.Wiring.Supply.MaxCurrent; !(a < most) {
		return most
	}
	return a
}

// limitTo sets the supply's current limit where it is another one; the driver reads it back.
func (r *Runner) limitTo(ctx context.Context, amperes float64) error {
	if amperes == r.limit {
		return nil
	}
	r.limit = 0 // unknown until read back
	if err := r.o.Bench.Supply.SetCurrentLimit(ctx, si.Amperes(amperes)); err != nil {
		return fmt.Errorf("current limit: %w", err)
	}
	r.limit = amperes
	return nil
}

// feed brings the supply from one setpoint to another. Going up the limit goes
// first, going down last: what the board draws meanwhile belongs to the higher one.
func (r *Runner) feed(ctx context.Context, from, to sweeps.Setpoint) error {
	limit := r.currentLimit(to)
	if from.Supply == to.Supply {
		return r.limitTo(ctx, limit)
	}
	if limit > r.limit {
		if err := r.limitTo(ctx, limit); err != nil {
			return err
		}
	}
	d := r.driving()
	d.on = false // between two voltages no reading is off target
	r.drives(d)
	if err := r.o.Bench.Supply.SetVoltage(ctx, si.Volts(to.Supply)); err != nil {
		return err
	}
	r.say("Supply to " + si.Format(to.Supply, si.Volt) + ".")
	if err := r.arrive(ctx, to.Supply); err != nil {
		return err
	}
	return r.limitTo(ctx, limit)
}

// Arriving: a supply goes up at once, but sinks no current; going down, its
// output capacitor empties through the board alone.
const (
	arriveWithin = 20 * time.Second // bench time: common practice, no source
	arriveLook   = 50 * time.Millisecond
	targetShare  = 0.02 // of the voltage set
	targetFloor  = 50e-3
)

// arrive waits until the supply reads what was set, and from then on holds it to that.
func (r *Runner) arrive(ctx context.Context, volts float64) error {
	for began := r.o.Clock.Elapsed(); ; {
		var s instruments.SupplyState
		err := r.again(ctx, 0, func(ctx context.Context) (err error) { s, err = r.look(ctx); return err })
		if err != nil {
			return err
		}
		if err := context.Cause(ctx); err != nil {
			return err
		}
		if onTarget(s.Voltage, volts) {
			r.drives(drive{on: true, volts: volts})
			return nil
		}
		if r.o.Clock.Elapsed()-began > arriveWithin {
			return &Trip{Raw: s.Voltage.Raw, Reason: fmt.Sprintf("supply off target: set to %s, it still reads %s after %s",
				si.Volts(volts), si.Format(s.Voltage.Value, si.Volt), arriveWithin)}
		}
		if err := r.o.Clock.Sleep(ctx, arriveLook); err != nil {
			return err
		}
	}
}

// onTarget tells whether a voltage read is the one set, within the error of the reading.
func onTarget(s instruments.Sample, volts float64) bool {
	return s.Outcome == instruments.Measured &&
		math.Abs(s.Value-volts) <= targetShare*volts+targetFloor+s.Accuracy.Limit(s.Value, s.Range)
}
