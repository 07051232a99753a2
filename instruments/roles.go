package instruments

import (
	"context"

	"nightbench/instruments/si"
)

// SupplyState is one look at a supply. Energised is the output as the instrument
// states it, which is a claim: only a voltage read back confirms off.
type SupplyState struct {
	Output   bool   `json:"output"`   // as stated by the instrument
	Limiting bool   `json:"limiting"` // in current limit
	Tripped  bool   `json:"tripped"`  // a protection latch holds the output off
	Voltage  Sample `json:"voltage"`  // measured at its terminals, V
	Current  Sample `json:"current"`  // measured, A
}

// Supply is one channel of a bench supply. Every setter reads back what took
// effect and fails when it differs by more than the resolution.
type Supply interface {
	Identifier
	SetVoltage(ctx context.Context, v si.Voltage) error
	SetCurrentLimit(ctx context.Context, i si.Current) error
	// Protect sets the instrument's own over-voltage level and reads it back.
	Protect(ctx context.Context, v si.Voltage) error
	// SetOutput switches the output and reads back its state.
	SetOutput(ctx context.Context, on bool) error
	// Off sends the shortest output-off the dialect knows, at once: without waiting
	// for a reply, and without getting in step first. On a dead link it abandons the
	// link, opens it anew and sends again. It confirms nothing.
	Off(ctx context.Context) error
	State(ctx context.Context) (SupplyState, error)
}

// MeterSettings are what a meter is told before a reading. In a request a zero
// Aperture means the meter's default; in an answer all fields are as read back.
type MeterSettings struct {
	Unit     si.Unit // Volt or Ampere, DC
	Range    float64 // least full scale wanted, in Unit; the meter takes the next range up
	Aperture float64 // s; the meter takes the nearest it has
}

// Meter is a multimeter that integrates over its aperture.
type Meter interface {
	Identifier
	// Configure sets function, range and aperture and answers what is in force.
	Configure(ctx context.Context, s MeterSettings) (MeterSettings, error)
	// Read takes a new reading, never an old one. Overload is an outcome, not an error.
	Read(ctx context.Context) (Sample, error)
}

// ScopeSettings are what a scope is told before a record.
type ScopeSettings struct {
	Channels []ScopeChannel
	Points   int     // samples a channel
	Duration float64 // s, of the whole record
	Trigger  ScopeTrigger
}

// ScopeChannel is one channel's vertical setting: full scale from Low to High, V at the probe's tip.
type ScopeChannel struct {
	Number    int
	Low, High float64
	Probe     float64 // attenuation, 10 for a ×10 probe
}

// ScopeTrigger is the positive-going crossing of Level (V at the tip) by Channel.
type ScopeTrigger struct {
	Channel int
	Level   float64
}

// Scope takes single records.
type Scope interface {
	Identifier
	// Configure answers the settings in force.
	Configure(ctx context.Context, s ScopeSettings) (ScopeSettings, error)
	// Capture takes one new record of the channels configured. Where no trigger
	// came it takes one untriggered record and says so in Triggered.
	Capture(ctx context.Context) ([]Waveform, error)
}

// Pot is a digital potentiometer behind a bridge that answers with the code read back.
type Pot interface {
	Identifier
	// SetCode writes a code, reads it back from the part, and fails when they differ.
	SetCode(ctx context.Context, code int) error
	Code(ctx context.Context) (int, error)
}

// Cutoff is a second, independent way to cut power. It opens by itself unless fed.
type Cutoff interface {
	Feed(ctx context.Context) error
	// Open cuts power at once and keeps it cut until Feed is called again.
	Open(ctx context.Context) error
}
