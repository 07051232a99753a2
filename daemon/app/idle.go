package app

import (
	"context"
	"fmt"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// While no run is open, wall times.
const (
	idleEvery   = 2 * time.Second  // how often the supply is looked at
	idleBlind   = 5 * time.Second  // without a good look, off is no longer known
	idleAttempt = 15 * time.Second // one attempt at making safe
	idleAgain   = time.Second      // between two attempts
)

// tryOff makes one bounded attempt at making safe and keeps what it found.
func (d *Daemon) tryOff() sweeps.Off {
	ctx, cancel := context.WithTimeout(d.idling, idleAttempt)
	defer cancel()
	off := sweeps.OffFrom(instruments.MakeSafe(ctx, d.clock, d.bench.Bench, safe()))
	d.know(off)
	return off
}

// keepTrying goes on making safe until off is confirmed or the daemon ends; one such loop at a time.
func (d *Daemon) keepTrying() {
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.trying {
		return
	}
	d.trying = true
	d.behind.Go(func() {
		defer d.triedOut()
		for d.clock.Wait(d.idling, idleAgain) == nil {
			off := d.tryOff()
			if !off.Confirmed {
				d.o.Log.Error("OFF IS NOT CONFIRMED", "do", off.Words)
				continue
			}
			if _, err := d.store.Append(d.idling, sweeps.Entry{Kind: sweeps.KindOff, Words: off.Words, Off: &off}); err != nil {
				d.o.Log.Error("that off is confirmed could not be written", "err", err)
			}
			return
		}
	})
}

func (d *Daemon) triedOut() {
	d.mu.Lock()
	defer d.mu.Unlock()
	d.trying = false
}

// know keeps what making safe found while no run is open. A doubt is cleared by another making safe only.
func (d *Daemon) know(off sweeps.Off) {
	d.mu.Lock()
	defer d.mu.Unlock()
	at := off.At
	runner.KnowOff(&d.idle, off)
	d.doubted = !off.Confirmed
	d.idle.Energised, d.idle.Since, d.idle.ConfirmedBy = sweeps.EnergisedUnconfirmed, &at, nil
	if off.Confirmed {
		d.idle.Energised, d.idle.ConfirmedBy = sweeps.EnergisedNo, off.By
	}
}

// foundOn looks what the bench was found like. An output that was on already is said, and left as it is.
func (d *Daemon) foundOn(ctx context.Context) {
	d.idleLook(ctx)
	if d.bench.FoundOn {
		d.o.Log.Warn("the supply's output was on already; no run starts before it is off: press Outputs off, or find out who feeds the board")
	}
}

// watchIdle looks at the supply while no run does.
func (d *Daemon) watchIdle(ctx context.Context) {
	for d.clock.Wait(ctx, idleEvery) == nil {
		if d.active() == nil {
			d.idleLook(ctx)
		}
	}
}

// idleLook reads the supply once and judges what is known of its output.
func (d *Daemon) idleLook(ctx context.Context) {
	s, err := d.bench.Bench.Supply.State(ctx)
	if ctx.Err() != nil || d.active() != nil {
		return
	}
	d.mu.Lock()
	defer d.mu.Unlock()
	now := d.clock.Now()
	if err != nil {
		d.idleUnseen(now)
		return
	}
	d.idle.ReadAt = &now
	d.idle.Voltage, d.idle.VoltageU = runner.SampleValue(s.Voltage)
	d.idle.Current, d.idle.CurrentU = runner.SampleValue(s.Current)
	d.idleJudge(s, now)
}

// idleUnseen is a look that failed: off is known only for as long as somebody saw it. Under mu.
func (d *Daemon) idleUnseen(now time.Time) {
	if d.idle.ReadAt == nil || now.Sub(*d.idle.ReadAt) > idleBlind {
		d.idleBecomes(sweeps.EnergisedUnconfirmed, nil, now)
		d.idle.Detail = "The supply does not answer: nobody sees whether its output is off."
	}
}

// idleJudge says what a good look means. Off needs a witness: a voltage read back
// below what counts as off. Under mu.
func (d *Daemon) idleJudge(s instruments.SupplyState, now time.Time) {
	d.idle.Detail = ""
	low := d.idle.Voltage != nil && *d.idle.Voltage < Below
	switch {
	case s.Output:
		d.idleBecomes(sweeps.EnergisedYes, nil, now)
	case d.doubted:
	case low:
		d.idleBecomes(sweeps.EnergisedNo, []string{"supply"}, now)
	default:
		d.idleBecomes(sweeps.EnergisedUnconfirmed, nil, now)
		if d.idle.Voltage != nil {
			d.idle.Detail = fmt.Sprintf("The output is off, and %s stands at its terminals: a motor coasting down, or back-feed from elsewhere.", si.Format(*d.idle.Voltage, si.Volt))
		}
	}
}

func (d *Daemon) idleBecomes(e sweeps.Energised, by []string, now time.Time) {
	if d.idle.Energised == e {
		return
	}
	d.idle.Energised, d.idle.Since, d.idle.ConfirmedBy = e, &now, by
}
