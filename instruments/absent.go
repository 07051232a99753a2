package instruments

import (
	"context"
	"errors"
	"fmt"

	"nightbench/instruments/si"
)

// ErrCannot means that an instrument, or the dialect it is spoken to in, has no such ability.
var ErrCannot = errors.New("not in this dialect")

// ErrAbsent means that the bench has no such instrument.
var ErrAbsent = errors.New("not on this bench")

// Absent stands for an instrument the bench file does not name, in any role:
// every call fails with ErrAbsent and the key to add.
type Absent struct {
	Role string // "scope"
	Key  string // what to add to the bench file: `[scope] with address = "tcp://…"`
}

var (
	_ Supply = Absent{}
	_ Meter  = meterless{}
	_ Scope  = scopeless{}
	_ Pot    = Absent{}
	_ Cutoff = Absent{}
)

// NoSupply, NoScope, NoPot, NoCutoff and NoMeter are the null objects of the roles.
var (
	NoSupply Supply = Absent{Role: "supply", Key: `[supply] with address = "serial:///dev/serial/by-id/…"`}
	NoScope  Scope  = scopeless{Absent{Role: "scope", Key: `[scope] with address = "tcp://…:5025"`}}
	NoPot    Pot    = Absent{Role: "pot", Key: `[pot] with address = "serial:///dev/serial/by-id/…", or address = "manual"`}
	NoCutoff Cutoff = Absent{Role: "cutoff", Key: `[cutoff] with address = "serial:///dev/serial/by-id/…"`}
)

// NoMeter is the null object of a meter that would read a quantity.
func NoMeter(reads string) Meter {
	return meterless{Absent{Role: "meter", Key: fmt.Sprintf("[[meter]] with reads = %q and its address", reads)}}
}

func (a Absent) err() error {
	return fmt.Errorf("%s: %w; add %s to the bench file", a.Role, ErrAbsent, a.Key)
}

// Identify fails with ErrAbsent; so do all the others.
func (a Absent) Identify(context.Context) (Identity, error)        { return Identity{}, a.err() }
func (a Absent) SetVoltage(context.Context, si.Voltage) error      { return a.err() }
func (a Absent) SetCurrentLimit(context.Context, si.Current) error { return a.err() }
func (a Absent) Protect(context.Context, si.Voltage) error         { return a.err() }
func (a Absent) SetOutput(context.Context, bool) error             { return a.err() }
func (a Absent) Off(context.Context) error                         { return a.err() }
func (a Absent) State(context.Context) (SupplyState, error)        { return SupplyState{}, a.err() }
func (a Absent) SetCode(context.Context, int) error                { return a.err() }
func (a Absent) Code(context.Context) (int, error)                 { return 0, a.err() }
func (a Absent) Feed(context.Context) error                        { return a.err() }
func (a Absent) Open(context.Context) error                        { return a.err() }

// meterless and scopeless differ only in what Configure takes.
type meterless struct{ Absent }

func (a meterless) Configure(context.Context, MeterSettings) (MeterSettings, error) {
	return MeterSettings{}, a.err()
}
func (a meterless) Read(context.Context) (Sample, error) { return Sample{}, a.err() }

type scopeless struct{ Absent }

func (a scopeless) Configure(context.Context, ScopeSettings) (ScopeSettings, error) {
	return ScopeSettings{}, a.err()
}
func (a scopeless) Capture(context.Context) ([]Waveform, error) { return nil, a.err() }
