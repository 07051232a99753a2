package app

import (
	"context"
	"fmt"

	"nightbench/daemon/web"
	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// conflict says that what is asked does not go with what is going on.
func conflict(format string, args ...any) error {
	return web.Fail(web.Conflict, fmt.Errorf(format, args...))
}

func (d *Daemon) active() *active {
	d.mu.Lock()
	defer d.mu.Unlock()
	return d.run
}

// command passes a person's wish to the open run.
func (d *Daemon) command(c runner.Command, by string) error { return d.active().command(c, by) }

// command passes a wish to this run; a is nil where none is open.
func (a *active) command(c runner.Command, by string) error {
	if a == nil {
		return conflict("%s: no run is open", c)
	}
	if err := a.runner.Command(c, named(by)); err != nil {
		return conflict("%s", err)
	}
	return nil
}

func named(by string) string {
	if by == "" {
		return "the operator"
	}
	return by
}

// Stop ends the open run and returns when the bench is safe, or ctx ends.
func (d *Daemon) Stop(ctx context.Context, reason, by string) error {
	a := d.active()
	by = named(by)
	if reason != "" {
		by += ": " + reason
	}
	if err := a.command(runner.CmdStop, by); err != nil {
		return err
	}
	return wait(ctx, a)
}

func wait(ctx context.Context, a *active) error {
	select {
	case <-a.done:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	}
}

// Hold finishes the reading in hand and switches the output off.
func (d *Daemon) Hold(_ context.Context, by string) error { return d.command(runner.CmdHold, by) }

// Continue lets a held run go on.
func (d *Daemon) Continue(_ context.Context, by string) error {
	return d.command(runner.CmdContinue, by)
}

// Off switches the outputs off, with or without a run, and says what is known then.
// Where off is not confirmed at once it goes on trying behind the answer.
func (d *Daemon) Off(ctx context.Context, by string) (sweeps.Off, error) {
	if a := d.pressOff(); a != nil {
		if err := a.runner.Command(runner.CmdOff, named(by)); err == nil {
			if err := wait(ctx, a); err != nil {
				return sweeps.Off{}, err
			}
			return a.end.Off, nil
		}
	}
	off := d.tryOff()
	words := "Outputs off, by " + named(by) + ". " + off.Words
	if !off.Confirmed {
		d.keepTrying()
	}
	_, err := d.store.Append(context.WithoutCancel(ctx), sweeps.Entry{Kind: sweeps.KindOff, Words: words, Off: &off})
	return off, err
}

// pressOff counts the press, so that a run being started meanwhile is not, and gives the open run.
func (d *Daemon) pressOff() *active {
	d.mu.Lock()
	defer d.mu.Unlock()
	d.offs++
	return d.run
}

// safe is what safe means on every bench.
func safe() instruments.SafeSpec { return instruments.SafeSpec{Below: si.Volts(Below)} }

// end stops the open run, if any, and waits until the bench is safe. A daemon
// that ended a run says so by its error.
func (d *Daemon) end(cause error) error {
	d.mu.Lock()
	d.ending = true
	a := d.run
	d.mu.Unlock()
	if a == nil {
		return nil
	}
	a.cancel(&runner.Stop{Reason: "the daemon was told to end: " + cause.Error()})
	<-a.done // bounded by d.last: a second signal
	if !a.end.Off.Confirmed {
		return fmt.Errorf("off is not confirmed: %s", a.end.Off.Words)
	}
	return cause
}

// Wait returns when the run is over: how it ended.
func (d *Daemon) Wait(ctx context.Context, run int64) (sweeps.Run, error) {
	if a := d.active(); a != nil && a.id == run {
		if err := wait(ctx, a); err != nil {
			return sweeps.Run{}, err
		}
	}
	return d.store.Run(ctx, run)
}

// Vitals is the latest of what changes all the time.
func (d *Daemon) Vitals() sweeps.Vitals {
	d.mu.Lock()
	a, v := d.run, d.idle
	d.mu.Unlock()
	if a != nil {
		v = a.runner.Vitals()
	} else {
		v.At = d.clock.Now()
		v.Doing = "No run is open"
	}
	v.Instruments = d.answers.all()
	return v
}

// Bench is the wiring and who answers.
func (d *Daemon) Bench() web.Bench {
	b := web.Bench{Wiring: d.bench.Bench.Wiring}
	for _, i := range d.bench.Info {
		b.Instruments = append(b.Instruments, web.Instrument{Name: i.Name, Role: i.Role, Address: i.Address, Identity: i.Identity, Dialect: i.Dialect})
	}
	return b
}
