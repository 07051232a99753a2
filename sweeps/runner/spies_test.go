package runner_test

import (
	"context"
	"slices"
	"testing"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

type sample = instruments.Sample

func flagged(r sweeps.Reading, name string) bool {
	return slices.ContainsFunc(r.Flags, func(f sweeps.Flag) bool { return f.Name == name })
}

// meter, supply and journal put a hand between the run and the real thing.
type meter struct {
	instruments.Meter
	read func(context.Context) (sample, error)
}

func (m *meter) Read(ctx context.Context) (sample, error) {
	if m.read == nil {
		return m.Meter.Read(ctx)
	}
	return m.read(ctx)
}

type supply struct {
	instruments.Supply
	state func(context.Context) (instruments.SupplyState, error)
	off   func(context.Context) error
	volts func(context.Context, si.Voltage) error
}

func (s *supply) State(ctx context.Context) (instruments.SupplyState, error) {
	if s.state == nil {
		return s.Supply.State(ctx)
	}
	return s.state(ctx)
}

func (s *supply) Off(ctx context.Context) error {
	if s.off == nil {
		return s.Supply.Off(ctx)
	}
	return s.off(ctx)
}

func (s *supply) SetVoltage(ctx context.Context, v si.Voltage) error {
	if s.volts == nil {
		return s.Supply.SetVoltage(ctx, v)
	}
	return s.volts(ctx, v)
}

type journal func(context.Context, sweeps.Entry) (sweeps.Entry, error)

func (j journal) Append(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) { return j(ctx, e) }

// inNight is a night on the light board.
func inNight(t *testing.T, plan string, f func(n *night)) {
	t.Helper()
	onBoard(t, light(), plan, f)
}

// alter changes the true board while it runs.
func (n *night) alter(f func(*circuit.Board)) { n.must(n.practice.Alter(f)) }
