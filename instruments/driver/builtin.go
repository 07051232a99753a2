package driver

import (
	"context"

	"nightbench/instruments"
	"nightbench/instruments/si"
)

// builtIn are the quantities a scope may measure by itself, with their units.
var builtIn = map[string]si.Unit{
	"duty": si.One, "frequency": si.Hertz, "period": si.Second, "pulse_width": si.Second, "mean": si.Volt,
}

// Measure asks the scope for what it makes itself of a channel's last record:
// duty (as a ratio, whatever it answers in), frequency, period, pulse_width or
// mean. It carries no limit of error: the scope states none. That there is
// nothing to measure is an outcome, not an error.
func (s *Scope) Measure(ctx context.Context, what string, channel int) (instruments.Sample, error) {
	l, err := s.line("measure_" + what)
	if err != nil {
		return instruments.Sample{}, err
	}
	n, err := s.number(ctx, l, s.d.Put(0, channel))
	if err != nil {
		return instruments.Sample{}, err
	}
	out := sample(n, builtIn[what])
	out.At = s.clock.Now()
	return out, nil
}
