package runner

import (
	"context"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// One attempt at making safe is bounded, so that the words about it are written
// in time; attempts follow each other until off is confirmed. Wall time.
const (
	safeAttempt = 15 * time.Second
	safeAgain   = time.Second
)

// makeSafe is the one way to safe. It goes on until off is confirmed or last
// ends. The journal hears of the first failure and of the end, the log of every attempt.
func (r *Runner) makeSafe(last context.Context, p *pen) sweeps.Off {
	for first := true; ; first = false {
		off := r.switchOff(last)
		if first || off.Confirmed {
			p.off(off)
		}
		if off.Confirmed {
			return off
		}
		r.doing("OFF IS NOT CONFIRMED", off.Words)
		r.o.Log.Error("OFF IS NOT CONFIRMED", "run", r.o.Run.ID, "do", off.Words)
		if r.o.Clock.Wait(last, safeAgain) != nil {
			return off
		}
	}
}

// switchOff makes one attempt, one at a time, and says what is now known of the output.
func (r *Runner) switchOff(ctx context.Context) (off sweeps.Off) {
	<-r.offing
	defer func() { r.offing <- struct{}{} }()
	r.drives(drive{})
	r.setFeeding(false)
	ctx, cancel := context.WithTimeout(ctx, safeAttempt)
	defer cancel()
	err := guard("making safe", func() error {
		off = sweeps.OffFrom(instruments.MakeSafe(ctx, r.o.Clock, r.o.Bench, r.o.Safe))
		return nil
	})
	if err != nil {
		r.logPanic(err)
		off = sweeps.Off{By: []string{}, At: r.o.Clock.Now(), Words: "NOT CONFIRMED OFF: " + err.Error() + ". Treat the board as energised. " + r.o.Safe.Words}
	}
	r.sawOff(off)
	if !off.Confirmed {
		return off
	}
	if err := r.o.Mark.Clear(); err != nil {
		r.o.Log.Error("the energised record could not be cleared; the next start will make safe again", "err", err)
	}
	return off
}

// sawOff keeps what making safe found.
func (r *Runner) sawOff(off sweeps.Off) {
	if off.Voltage != nil {
		r.tell(func(v *sweeps.Vitals) {
			v.Voltage, v.VoltageU, v.Current, v.CurrentU, v.ReadAt = off.Voltage, nil, nil, nil, &off.At
		})
	}
	if off.Confirmed {
		r.setEnergised(sweeps.EnergisedNo, off.By)
	} else {
		r.setEnergised(sweeps.EnergisedUnconfirmed, nil)
	}
}

// KnowOff puts what making safe last read into the vitals, in place of older readings.
func KnowOff(v *sweeps.Vitals, off sweeps.Off) {
	at := off.At
	v.Voltage, v.VoltageU, v.Current, v.CurrentU, v.ReadAt = off.Voltage, nil, nil, nil, &at
}
