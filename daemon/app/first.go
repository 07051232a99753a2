package app

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/bench"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// safeFirst makes the bench safe before anything else when an earlier daemon
// left it energised: without the database, without the rest of the bench. It
// goes on until off is confirmed, with the loudest notice it has.
func (d *Daemon) safeFirst(ctx context.Context) error {
	e, there, err := readEnergised(d.state.Dir())
	if err != nil || !there {
		return err
	}
	clock := instruments.NewClock(max(e.Pace, 1))
	d.o.Log.Warn("an earlier daemon left the bench energised: making it safe first", "since", e.At, "run", e.Run, "supply", e.Address)
	for {
		off, err := d.offBy(ctx, clock, e)
		if err == nil && off.Confirmed {
			d.first = &off
			d.o.Log.Info("off, confirmed", "by", off.By)
			return errors.Join(keepMadeSafe(d.state.Dir(), off), removeDurably(energisedPath(d.state.Dir())))
		}
		d.o.Log.Error("OFF IS NOT CONFIRMED: switch the supply off at its front panel and look that it is off. When it is, and this supply is gone for good, delete the record", "supply", e.Address, "record", energisedPath(d.state.Dir()), "words", off.Words, "err", err)
		if err := clock.Wait(ctx, time.Second); err != nil {
			return fmt.Errorf("off was never confirmed (%s): switch the supply off at its front panel; the next start tries again: %w", e.Address, err)
		}
	}
}

// offBy makes one attempt with nothing but what the energised record says.
func (d *Daemon) offBy(ctx context.Context, clock instruments.Clock, e Energised) (sweeps.Off, error) {
	ctx, cancel := context.WithTimeout(ctx, 15*time.Second)
	defer cancel()
	s, err := bench.OpenSupply(ctx, e.Address, e.Dialect, e.Channel, bench.Options{Clock: clock, Log: func(words string) { d.o.Log.Warn(words) }})
	if err != nil {
		return sweeps.Off{}, err
	}
	defer s.Close(context.WithoutCancel(ctx))
	b := instruments.Bench{Supply: s.Supply}
	return sweeps.OffFrom(instruments.MakeSafe(ctx, clock, b, instruments.SafeSpec{Below: si.Volts(e.Below)})), nil
}

// closeInterrupted ends a run that an earlier daemon left open, with what was done
// about its output. It can be resumed, by a person.
func (d *Daemon) closeInterrupted(ctx context.Context) error {
	run, open, err := d.store.OpenRun(ctx)
	if err != nil || !open {
		return err
	}
	did := "its output was not on"
	if d.first == nil {
		d.first = madeSafe(d.state.Dir())
	}
	if d.first != nil {
		did = "its output was switched off at the next start, confirmed by " + strings.Join(d.first.By, " and ")
		if _, err := d.store.Append(ctx, sweeps.Entry{Run: run.ID, Kind: sweeps.KindOff, Words: "Off at the next start. " + d.first.Words, Off: d.first}); err != nil {
			return err
		}
	}
	words := fmt.Sprintf("the daemon was ended in the middle of it; %s. %d of %d points are kept; resume goes on", did, run.Measured, run.Planned)
	if _, err = d.store.Append(ctx, sweeps.Entry{Run: run.ID, Kind: sweeps.KindEnded, State: sweeps.Interrupted, Words: words}); err != nil {
		return err
	}
	return removeDurably(madeSafePath(d.state.Dir()))
}

// A start that made safe and then failed, on a file with a mistake perhaps, leaves
// word of it for the journal that the next start can open.

func madeSafePath(dir string) string { return filepath.Join(dir, "made-safe.json") }

func keepMadeSafe(dir string, off sweeps.Off) error {
	b, err := json.Marshal(off)
	if err != nil {
		return err
	}
	return writeDurably(madeSafePath(dir), append(b, '\n'))
}

// madeSafe is what an earlier start left word of; nil where there is none to be read.
func madeSafe(dir string) *sweeps.Off {
	b, err := os.ReadFile(madeSafePath(dir))
	var off sweeps.Off
	if err != nil || json.Unmarshal(b, &off) != nil {
		return nil
	}
	return &off
}
