package scpi

import "fmt"

// readArgs checks parameters against what a header takes.
func readArgs(args []Arg, params []Param) ([]any, error) {
	if len(params) > len(args) {
		return nil, NewFault(ParameterNotAllowed, "")
	}
	values := make([]any, len(args))
	for i, a := range args {
		if i >= len(params) {
			if !a.optional() {
				return nil, NewFault(MissingParameter, "")
			}
			continue
		}
		v, err := a.read(params[i])
		if err != nil {
			return nil, err
		}
		values[i] = v
	}
	return values, nil
}

// Has says whether parameter i, counted from 0, was given.
func (c *Call) Has(i int) bool { return i < len(c.args) && c.args[i] != nil }

// Number is parameter i, a Numeric. It is 0 when the parameter was left out
// or a word was given in its place: ask Has and Word first where they may be.
func (c *Call) Number(i int) float64 { return arg[float64](c, i) }

// Int is parameter i, a Numeric with Integer set.
func (c *Call) Int(i int) int { return int(c.Number(i)) }

// Bool is parameter i, a Boolean.
func (c *Call) Bool(i int) bool { return arg[bool](c, i) }

// Word is the short form of parameter i, a Choice, or a word in place of a
// Numeric; empty when it is a number or was left out.
func (c *Call) Word(i int) string { return arg[string](c, i) }

// Text is parameter i, a Text or Expr.
func (c *Call) Text(i int) string { return arg[string](c, i) }

// Data is parameter i, a Data.
func (c *Call) Data(i int) []byte { return arg[[]byte](c, i) }

// Channels is parameter i, a Channels.
func (c *Call) Channels(i int) []int { return arg[[]int](c, i) }

// arg gives parameter i if it has that type, else the type's zero value.
func arg[T any](c *Call, i int) T {
	var none T
	if !c.Has(i) {
		return none
	}
	if v, ok := c.args[i].(T); ok {
		return v
	}
	return none
}

// NR3 spells a number for a reply with nine significant digits, as the HP
// 34401A does: SD.DDDDDDDDESDD (HP 34401A User's Guide p. 159).
func NR3(v float64) string { return fmt.Sprintf("%+.8E", v) }

// Bit spells a boolean for a reply: 1 or 0.
func Bit(b bool) string {
	if b {
		return "1"
	}
	return "0"
}

// FormatBlock puts bytes in an arbitrary block of definite length.
func FormatBlock(data []byte) string {
	count := fmt.Sprint(len(data))
	return fmt.Sprintf("#%d%s%s", len(count), count, data)
}
