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

// note writes why the bench is being made safe, beside the making safe itself: it never holds it up.
func (r *Runner) note(end Outcome) {
	switch end.State {
	case sweeps.Tripped, sweeps.Failed:
		if _, err := r.append(sweeps.Entry{Kind: sweeps.KindTrip, Words: end.Reason}); err != nil {
			r.o.Log.Error("the reason could not be written", "run", r.o.Run.ID, "reason", end.Reason, "err", err)
		}
	}
}

// makeSafe is the one way to safe. It goes on until off is confirmed or last ends.
func (r *Runner) makeSafe(last context.Context) sweeps.Off {
	said := false
	for {
		off := r.switchOff(last)
		if off.Confirmed || !said {
			said = true
			r.sayOff(off)
		}
		if off.Confirmed || r.o.Clock.Wait(last, safeAgain) != nil {
			return off
		}
	}
}

// switchOff makes one attempt and says what is now known of the output.
func (r *Runner) switchOff(ctx context.Context) sweeps.Off {
	ctx, cancel := context.WithTimeout(ctx, safeAttempt)
	defer cancel()
	off := sweeps.OffFrom(instruments.MakeSafe(ctx, r.o.Clock, r.o.Bench, r.o.Safe))
	r.tell(func(v *sweeps.Vitals) { KnowOff(v, off) })
	if !off.Confirmed {
		r.setEnergised(sweeps.EnergisedUnconfirmed, nil)
		return off
	}
	r.setEnergised(sweeps.EnergisedNo, off.By)
	if err := r.o.Mark.Clear(); err != nil {
		r.o.Log.Error("the energised record could not be cleared; the next start will make safe again", "err", err)
	}
	return off
}

func (r *Runner) sayOff(off sweeps.Off) {
	if _, err := r.append(sweeps.Entry{Kind: sweeps.KindOff, Words: off.Words, Off: &off}); err != nil {
		r.o.Log.Error("the making safe could not be written", "run", r.o.Run.ID, "err", err)
	}
	if !off.Confirmed {
		r.o.Log.Error("OFF IS NOT CONFIRMED", "run", r.o.Run.ID, "do", off.Words)
	}
}

// KnowOff puts what making safe last read into the vitals, in place of older readings.
func KnowOff(v *sweeps.Vitals, off sweeps.Off) {
	at := off.At
	v.Voltage, v.VoltageU, v.Current, v.CurrentU, v.ReadAt = off.Voltage, nil, nil, nil, &at
}
