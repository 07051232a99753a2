package driver

import (
	"context"
	"fmt"

	"nightbench/instruments/si"
)

// ProtectCurrent sets the instrument's own over-current level, where it has one
// apart from its limit, arms it where it has to be armed, and reads both back.
func (s *Supply) ProtectCurrent(ctx context.Context, i si.Current) error {
	if !(i.SI() > 0) {
		return &Error{Instrument: s.name, Command: "over-current " + i.String(), Err: ErrRefused, Try: "give a level above 0 A"}
	}
	if _, err := s.set(ctx, "over_current", s.put(i.SI()), si.Ampere); err != nil {
		return err
	}
	if s.has("over_current_arm") {
		return s.ensure(ctx, "over_current_arm", s.put(0))
	}
	return nil
}

// ClearTrip clears the protections' latches with the output off: off first,
// read back; then the clear; then off again and read back, since clearing
// switches some instruments on again (Keysight E3632A User's Guide p. 91). The
// cause has to be gone; a latch that stays is an ErrTripped.
func (s *Supply) ClearTrip(ctx context.Context) error {
	if err := s.SetOutput(ctx, false); err != nil {
		return err
	}
	cleared := false
	for _, name := range []string{"over_voltage_clear", "over_current_clear"} {
		if !s.has(name) {
			continue
		}
		cleared = true
		if err := s.ensure(ctx, name, s.put(0)); err != nil {
			return err
		}
		if s.d.Protection == nil || s.d.Protection.ClearEnergises {
			if err := s.Off(ctx); err != nil {
				return err
			}
		}
	}
	if !cleared {
		_, err := s.line("over_voltage_clear")
		return err
	}
	if err := s.SetOutput(ctx, false); err != nil {
		return err
	}
	if tripped, err := s.tripped(ctx); err != nil || !tripped {
		return err
	}
	return &Error{Instrument: s.name, Command: "clearing its protection", Err: fmt.Errorf("%w still", ErrTripped),
		Try: "take away the cause first: lower the setting, look at what it feeds"}
}
