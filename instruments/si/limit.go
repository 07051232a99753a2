package si

import (
	"fmt"
	"math"
	"strings"
)

// Limit is how far two values may differ: relative, absolute, or the larger of
// both: "5 %", "0.15 V", "2 % or 0.1 V", "1 points" (percentage points of a ratio).
type Limit struct {
	Relative float64
	Absolute float64 // in SI of Unit
	Unit     Unit    // of Absolute; empty where there is none
}

// Of is the limit in SI at a value: the larger of the relative and the absolute part.
func (l Limit) Of(value float64) float64 { return math.Max(l.Relative*math.Abs(value), l.Absolute) }

// UnmarshalText reads a limit.
func (l *Limit) UnmarshalText(b []byte) error {
	var out Limit
	for _, part := range strings.Split(string(b), " or ") {
		if err := out.add(strings.TrimSpace(part)); err != nil {
			return fmt.Errorf("%q is no limit: %w", b, err)
		}
	}
	*l = out
	return nil
}

func (l *Limit) add(part string) error {
	const want = `write it like "2 %", "0.1 V", "2 % or 0.1 V" or "1 points"`
	digits, unit := splitNumber(part)
	unit = strings.TrimSpace(unit)
	x, err := number(digits)
	if err != nil || x < 0 {
		return fmt.Errorf("%q is not a number with a unit; %s", part, want)
	}
	switch unit {
	case "":
		return fmt.Errorf("%q has no unit; %s", part, want)
	case "%", "ppm":
		l.Relative, err = parse(part, one{}.spec())
		return err
	case "points", "point":
		l.Absolute, l.Unit = x/100, One
		return nil
	}
	for _, d := range []dimension{volt{}, ampere{}, ohm{}, second{}, hertz{}} {
		sp := d.spec()
		if f, ok := sp.factor(unit); ok && unit != "" {
			l.Absolute, l.Unit = x*f, sp.unit
			return nil
		}
	}
	return fmt.Errorf("%q has an unknown unit %q; %s", part, unit, want)
}

// String writes the limit as UnmarshalText reads it.
func (l Limit) String() string {
	var parts []string
	if l.Relative != 0 {
		parts = append(parts, fmt.Sprintf("%.6g %%", l.Relative*100))
	}
	switch {
	case l.Absolute != 0 && l.Unit == One:
		parts = append(parts, fmt.Sprintf("%.6g points", l.Absolute*100))
	case l.Absolute != 0:
		parts = append(parts, Format(l.Absolute, l.Unit))
	}
	return strings.Join(parts, " or ")
}

// MarshalText writes what UnmarshalText reads.
func (l Limit) MarshalText() ([]byte, error) { return []byte(l.String()), nil }
