package scpi

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"nightbench/instruments/link"
)

// Outcome says what a numeric reply means.
type Outcome int

// The outcomes. Only Measured has a value.
const (
	// NoMeasurement: the instrument says that there is nothing to report. It
	// is also the zero Outcome, so that an empty Number is no reading of 0.
	NoMeasurement Outcome = iota
	// Measured: Value is a plain number below 1e30 in magnitude.
	Measured
	// Overload: beyond the range, +9.9E37 or -9.9E37 (SCPI-1999 infinity).
	Overload
	// NotANumber: 9.91E37 (SCPI-1999 NAN).
	NotANumber
)

// String is the outcome in words.
func (o Outcome) String() string {
	return [...]string{"no measurement", "measured", "overload", "not a number"}[o]
}

// Number is a numeric reply. Value is NaN unless Outcome is Measured; for an
// Overload Negative tells the side. Raw is the reply as received.
type Number struct {
	Value    float64
	Outcome  Outcome
	Negative bool
	Unit     string // the suffix that came with it, if the form allows one
	Raw      string
}

// The special numbers of SCPI-1999, from memory of volume 1 chapter 7 and as
// restated in the N1911A programming guide: infinity and not-a-number. No
// quantity of a bench reaches tooLarge, whatever a maker sends beyond it.
const (
	infinity   = 9.9e37
	notANumber = 9.91e37
	near       = 1e-4 // relative
	tooLarge   = 1e30
)

// NumberForm says what a numeric reply may hold besides a plain number in NR1,
// NR2 or NR3 form. The zero NumberForm allows nothing else.
type NumberForm struct {
	// Units are the suffixes that may follow, such as V or Hz; case counts,
	// and a prefix is not understood: "mV" must be asked for as such.
	Units []string
	// NoValue are whole replies that mean no measurement, such as "****".
	NoValue []string
	// InfinityIsNoMeasurement reads ±9.9E37 as NoMeasurement, as scopes mean
	// it, instead of Overload, as meters mean it.
	InfinityIsNoMeasurement bool
}

// ParseNumber reads a reply that must be a plain number.
func ParseNumber(text string) (Number, error) { return NumberForm{}.Parse(text) }

// Parse reads one numeric reply. An error is an ErrForm.
func (f NumberForm) Parse(text string) (Number, error) {
	body := strings.TrimSpace(text)
	if slices.Contains(f.NoValue, body) {
		return noNumber(text), nil
	}
	digits := decimalPrefix(body)
	unit := strings.TrimLeft(body[len(digits):], " ")
	value, err := strconv.ParseFloat(digits, 64)
	switch {
	case digits == "" || err != nil && !math.IsInf(value, 0):
		return noNumber(text), fmt.Errorf("%w: %q is no number", ErrForm, text)
	case strings.HasPrefix(unit, ","):
		return noNumber(text), fmt.Errorf("%w: %q; a comma is no decimal point, and one number was asked for", ErrForm, text)
	case unit != "" && !slices.Contains(f.Units, unit):
		return noNumber(text), fmt.Errorf("%w: %q after the number in %q", ErrForm, unit, text)
	}
	n := noNumber(text)
	n.Unit, n.Negative, n.Outcome = unit, math.Signbit(value), f.outcome(value)
	if n.Outcome == Measured {
		n.Value = value
	}
	return n, nil
}

func noNumber(raw string) Number { return Number{Value: math.NaN(), Raw: raw} }

func (f NumberForm) outcome(value float64) Outcome {
	size := math.Abs(value)
	switch {
	case size < tooLarge:
		return Measured
	case math.Abs(value-notANumber) <= near*notANumber:
		return NotANumber
	case math.Abs(size-infinity) <= near*infinity && !f.InfinityIsNoMeasurement:
		return Overload
	}
	return NoMeasurement
}

// decimalPrefix returns the longest start of text that is a whole NRf number:
// sign, digits with at most one point, exponent.
func decimalPrefix(text string) string {
	i := skipAny(text, 0, 1, "+-")
	start := i
	i = skipDigits(text, i)
	digits := i - start
	if i < len(text) && text[i] == '.' {
		end := skipDigits(text, i+1)
		digits += end - i - 1
		i = end
	}
	if digits == 0 {
		return ""
	}
	if i < len(text) && (text[i] == 'E' || text[i] == 'e') {
		from := skipAny(text, i+1, 1, "+-")
		if end := skipDigits(text, from); end > from {
			i = end
		}
	}
	return text[:i]
}

func skipDigits(text string, i int) int { return skipAny(text, i, len(text), "0123456789") }

// skipAny steps over at most most bytes of set.
func skipAny(text string, i, most int, set string) int {
	for ; most > 0 && i < len(text) && strings.IndexByte(set, text[i]) >= 0; most-- {
		i++
	}
	return i
}

// FormatNumber spells a value for a command: base units, no suffix, the
// fewest digits that give the same float64 back.
func FormatNumber(v float64) string { return strconv.FormatFloat(v, 'G', -1, 64) }

// QueryNumber asks for one number in the form of the options. A reply of
// another form is an ErrForm and puts the step in doubt, since it may be the
// answer to something else.
func (c *Conn) QueryNumber(ctx context.Context, query string) (n Number, err error) {
	err = c.QueryAs(ctx, query, func(reply string) error {
		n, err = c.opt.Numbers.Parse(reply)
		return err
	})
	return n, err
}

// QueryBool asks for a boolean in the words of the options.
func (c *Conn) QueryBool(ctx context.Context, query string) (b bool, err error) {
	err = c.QueryAs(ctx, query, func(reply string) error {
		b, err = ParseBool(reply, c.opt.Bools)
		return err
	})
	return b, err
}

// QueryString asks for a string in quotes, and returns what is inside.
func (c *Conn) QueryString(ctx context.Context, query string) (s string, err error) {
	err = c.QueryAs(ctx, query, func(reply string) error {
		s, err = ParseString(reply)
		return err
	})
	return s, err
}

// QueryAs is Query for a reply that parse must accept. A reply it refuses puts
// the step in doubt, since it may be the answer to something else.
func (c *Conn) QueryAs(ctx context.Context, query string, parse func(reply string) error) error {
	if err := checkMessage(query, true); err != nil {
		return err
	}
	return c.exchange(ctx, query, func(t *link.Turn) (string, error) {
		reply, err := t.ReadLine(ctx)
		if err == nil {
			err = parse(reply)
		}
		return reply, err
	})
}
