package instruments

import (
	"context"
	"fmt"
	"math"
	"strings"

	"nightbench/instruments/si"
)

// judge weighs what the witnesses say and puts it in words.
func (s *safing) judge(ctx context.Context, state SupplyState, seen bool) {
	r := &s.report
	r.Confirmed, r.By, r.At = false, nil, s.clock.Now()
	supplyOff, said := s.supplySays(state, seen)
	if supplyOff {
		r.By = append(r.By, "supply")
	}
	words, contradicted := []string{said}, false
	for i, m := range s.bench.Wiring.Meters {
		if m.Reads != "average_voltage" || i >= len(s.bench.Meters) || s.bench.Meters[i] == nil {
			continue
		}
		v, ok := s.witness(ctx, m.Name, s.bench.Meters[i])
		if ok {
			s.heard[m.Name] = v
		} else if v, ok = s.heard[m.Name]; !ok || math.Abs(v) < s.spec.Below.SI() {
			continue // only what it said against is kept in mind
		}
		words = append(words, fmt.Sprintf("meter %s reads %s", m.Name, si.Format(v, si.Volt)))
		if math.Abs(v) < s.spec.Below.SI() {
			r.By = append(r.By, "meter "+m.Name)
		} else {
			contradicted = true
		}
	}
	r.Confirmed = supplyOff && !contradicted
	r.Words = s.words(strings.Join(words, ", "), contradicted && supplyOff)
}

// supplySays reads a supply's state as a witness.
func (s *safing) supplySays(state SupplyState, seen bool) (off bool, said string) {
	switch v := state.Voltage; {
	case !seen:
		return false, "the supply can't be read"
	case v.Outcome != Measured:
		return false, fmt.Sprintf("the supply's voltage is %s (%q)", v.Outcome, v.Raw)
	default:
		s.report.Voltage = &v.Value
		said = fmt.Sprintf("the supply reads %s, output %s", si.Format(v.Value, si.Volt), map[bool]string{true: "on", false: "off"}[state.Output])
		return !state.Output && math.Abs(v.Value) < s.spec.Below.SI(), said
	}
}

// witness reads the meter over the load; one that can't be read says nothing.
func (s *safing) witness(ctx context.Context, name string, m Meter) (v float64, ok bool) {
	read := func(ctx context.Context) error {
		sample, err := m.Read(ctx)
		switch {
		case err != nil:
			return err
		case sample.Unit != si.Volt || sample.Outcome != Measured:
			return fmt.Errorf("it gave %q, %s", sample.Raw, sample.Outcome)
		}
		v = sample.Value
		return nil
	}
	step := func(ctx context.Context) error {
		if read(ctx) == nil {
			return nil
		}
		full := max(1.2*s.bench.Wiring.Supply.MaxVoltage, 10)
		if _, err := m.Configure(ctx, MeterSettings{Unit: si.Volt, Range: full}); err != nil {
			return err
		}
		return read(ctx)
	}
	ok = s.step(ctx, "second witness, meter "+name, step)
	return v, ok
}

// words says how it ended, for the margin of the page and the person who comes running.
func (s *safing) words(said string, contradicted bool) string {
	below := "below " + s.spec.Below.String()
	parked := ""
	if !s.report.Parked {
		parked = " The pot could not be parked."
	}
	switch {
	case s.report.Confirmed:
		return fmt.Sprintf("Output off, confirmed %s by %s: %s.%s", below, strings.Join(s.report.By, " and "), said, parked)
	case contradicted:
		return fmt.Sprintf("NOT CONFIRMED OFF: %s. The supply is off, yet there is voltage at the load: a motor still turning, or another source. Keep hands off. %s%s",
			said, s.spec.Words, parked)
	default:
		return fmt.Sprintf("NOT CONFIRMED OFF: %s. Treat the board as energised. %s%s", said, s.spec.Words, parked)
	}
}
