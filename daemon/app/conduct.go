package app

import (
	"context"
	"errors"
	"fmt"
	"runtime/debug"
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// conduct carries the open run to its end. A fault of this program in the conducting
// itself ends the run like any other failure: the bench is made safe, and it is said.
func (d *Daemon) conduct(ctx context.Context, a *active) {
	defer close(a.done)
	defer func() {
		if broke := recover(); broke != nil {
			a.end = d.rescue(a, broke)
		}
		a.cancel(nil)
		d.mu.Lock()
		defer d.mu.Unlock()
		d.run = nil
	}()
	a.end = a.runner.Conduct(ctx, d.last)
	v := a.runner.Vitals()
	d.mu.Lock()
	defer d.mu.Unlock()
	d.idle = sweeps.Vitals{Energised: v.Energised, Since: v.Since, ConfirmedBy: v.ConfirmedBy, Voltage: v.Voltage, VoltageU: v.VoltageU, Current: v.Current, CurrentU: v.CurrentU, ReadAt: v.ReadAt}
}

// rescueAttempt bounds one attempt at switching off, wall time.
const rescueAttempt = 15 * time.Second

// rescue makes the bench safe where the run's own way to safe broke down. It goes on
// until off is confirmed or nobody waits for it any more.
func (d *Daemon) rescue(a *active, broke any) runner.Outcome {
	d.o.Log.Error("a fault in this program ended the run; making the bench safe", "run", a.id, "fault", broke, "stack", string(debug.Stack()))
	end := runner.Outcome{State: sweeps.Failed, Reason: fmt.Sprintf("a fault in this program: %v; its log has the place: please report it", broke)}
	refused := a.runner.Command(runner.CmdOff, "the daemon") // whatever of the run still goes on ends
	for {
		end.Off = d.attemptOff()
		if end.Off.Confirmed {
			break
		}
		d.o.Log.Error("OFF IS NOT CONFIRMED: switch the supply off at its front panel and look that it is off", "words", end.Off.Words)
		if d.clock.Wait(d.last, time.Second) != nil {
			break
		}
	}
	d.know(end.Off)
	if err := errors.Join(refused, d.writeEnd(a.id, end)); err != nil {
		d.o.Log.Error("the run's end is not whole", "run", a.id, "err", err)
	}
	return end
}

// attemptOff makes one bounded attempt.
func (d *Daemon) attemptOff() sweeps.Off {
	ctx, cancel := context.WithTimeout(d.last, rescueAttempt)
	defer cancel()
	return sweeps.OffFrom(instruments.MakeSafe(ctx, d.clock, d.bench.Bench, safe()))
}

// writeEnd writes how a rescued run ended; the energised record goes only when off is confirmed.
func (d *Daemon) writeEnd(run int64, end runner.Outcome) error {
	ctx, cancel := context.WithTimeout(context.Background(), closeBudget)
	defer cancel()
	_, off := d.store.Append(ctx, sweeps.Entry{Run: run, Kind: sweeps.KindOff, Words: end.Off.Words, Off: &end.Off})
	_, over := d.store.Append(ctx, sweeps.Entry{Run: run, Kind: sweeps.KindEnded, State: end.State, Words: end.Reason})
	if !end.Off.Confirmed {
		return errors.Join(off, over)
	}
	return errors.Join(off, over, d.mark.Clear())
}
