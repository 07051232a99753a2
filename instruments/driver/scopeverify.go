package driver

import (
	"context"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/si"
)

// verify reads settings back before a record: the scope may have been switched off and
// on, or a knob turned at its panel. The time base is read every time and the channels in
// turn, which costs a record some four queries; after a failed exchange it is all of them.
func (s *Scope) verify(ctx context.Context) error {
	all := s.set.Channels
	if s.shaken.Load() {
		return s.same(ctx, all)
	}
	s.turn = (s.turn + 1) % len(all)
	return s.same(ctx, all[s.turn:s.turn+1])
}

// same reads back the time base and these channels. Where one departs nothing counts as configured any more.
func (s *Scope) same(ctx context.Context, channels []instruments.ScopeChannel) error {
	for _, want := range []struct {
		name  string
		value float64
		unit  si.Unit
	}{
		{"duration", s.set.Duration, si.Second}, {"time_scale", s.set.Duration / s.wide(), si.Second}, {"points", float64(s.set.Points), si.One},
	} {
		if err := s.still(ctx, want.name, s.put(want.value), want.unit, agrees); err != nil {
			return err
		}
	}
	for _, c := range channels {
		if err := s.sameChannel(ctx, c); err != nil {
			return err
		}
	}
	return nil
}

// sameChannel reads back what makes volts of a channel's codes: its screen, its probe, its coupling.
func (s *Scope) sameChannel(ctx context.Context, c instruments.ScopeChannel) error {
	height := c.High - c.Low
	scale := height / s.high()
	// An end of the screen may be 0 V, and so may its middle: they are judged against its height.
	end := func(perVolt float64) func(l dialect.Line, want, found float64) bool {
		return func(l dialect.Line, want, found float64) bool {
			return math.Abs(found-want) <= max(l.Step, max(l.Within, 1e-6)*height*math.Abs(perVolt))
		}
	}
	middle := offset{1}
	if s.d.Screen != nil {
		middle = offsetOf(s.d.Screen.Offset, scale)
	}
	for _, want := range []struct {
		name   string
		value  float64
		unit   si.Unit
		agrees func(l dialect.Line, want, found float64) bool
	}{
		{"range_high", c.High, si.Volt, end(1)}, {"range_low", c.Low, si.Volt, end(1)},
		{"vertical_scale", scale, si.Volt, agrees}, {"vertical_offset", middle.of((c.High + c.Low) / 2), si.Volt, end(middle.factor)},
		{"probe", c.Probe, si.One, agrees},
	} {
		if want.name == "probe" && !(c.Probe > 0) {
			continue // none was told
		}
		if err := s.still(ctx, want.name, s.d.Put(want.value, c.Number), want.unit, want.agrees); err != nil {
			return err
		}
	}
	return s.stillCoupled(ctx, s.d.Put(0, c.Number))
}

func agrees(l dialect.Line, want, found float64) bool { return l.Agrees(want, found) }

// still asks for a setting by name, where the dialect has it, and fails when it is no longer p's value.
func (s *Scope) still(ctx context.Context, name string, p dialect.Put, unit si.Unit, agree func(l dialect.Line, want, found float64) bool) error {
	if !s.has(name) {
		return nil
	}
	l, err := s.line(name)
	if err != nil {
		return err
	}
	found, err := s.measured(ctx, l, p)
	if err != nil || agree(l, p.Value, found) {
		return err
	}
	return s.departed(p.Fill(l.Ask), si.Format(found, unit))
}

// stillCoupled is still for the coupling, which is a word.
func (s *Scope) stillCoupled(ctx context.Context, p dialect.Put) error {
	if !s.has("coupling") {
		return nil
	}
	l, err := s.line("coupling")
	if err != nil || l.Ask == "" {
		return err
	}
	found, err := s.word(ctx, l, p)
	if err != nil || s.wanted(l, p, found) {
		return err
	}
	return s.departed(p.Fill(l.Ask), found)
}

// departed says that a setting is lost; with it, all are.
func (s *Scope) departed(query, found string) error {
	s.set = instruments.ScopeSettings{}
	return &Error{Instrument: s.name, Command: query, Found: found, Err: ErrSettingsLost, Try: "was it switched off and on? configure it again"}
}
