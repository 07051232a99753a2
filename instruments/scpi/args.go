package scpi

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Arg is one parameter a header takes. The forms below are all there are.
type Arg interface {
	// read checks a parameter and gives its value; the error is a Fault.
	read(p Param) (any, error)
	optional() bool
}

// Numeric is a number. The value the handler sees is in base units.
type Numeric struct {
	Unit     string // base unit in capitals, such as V, HZ, OHM; empty: no suffix allowed
	Min, Max float64
	Default  float64
	// Limits, when set, is asked instead of Min, Max and Default: for limits
	// that depend on a range.
	Limits   func() (low, high, def float64)
	Integer  bool // rounded to a whole number
	Optional bool
	// Words are character data allowed in place of a number, such as AUTO,
	// written as BUS or IMMediate; see Call.Word.
	Words []string
}

// Boolean is ON, OFF or a number, which is rounded: non-zero is ON.
type Boolean struct{ Optional bool }

// Choice is one of some words, written with the short form in capitals.
type Choice struct {
	Words    []string
	Optional bool
}

// Text is a string in quotes.
type Text struct{ Optional bool }

// Data is an arbitrary block of at most Max bytes; 0 means any.
type Data struct {
	Max      int
	Optional bool
}

// Channels is a channel list such as (@1,3:5), each from 1 to Max.
type Channels struct {
	Max      int
	Optional bool
}

// Expr is an expression in brackets, taken as it is.
type Expr struct{ Optional bool }

// limitWord is MINimum, MAXimum or DEFault after a query.
type limitWord struct{ Numeric }

func (n Numeric) optional() bool  { return n.Optional }
func (b Boolean) optional() bool  { return b.Optional }
func (c Choice) optional() bool   { return c.Optional }
func (t Text) optional() bool     { return t.Optional }
func (d Data) optional() bool     { return d.Optional }
func (c Channels) optional() bool { return c.Optional }
func (e Expr) optional() bool     { return e.Optional }
func (limitWord) optional() bool  { return true }

// notAllowed is the fault for a parameter of a form that is not taken here.
func notAllowed(p Param) error {
	return NewFault(map[Kind]int{Character: CharacterNotAllowed, Decimal: NumericNotAllowed, NonDecimal: NumericNotAllowed,
		Quoted: StringNotAllowed, Block: BlockNotAllowed, Expression: ExpressionNotAllowed}[p.Kind], p.Text)
}

func (n Numeric) limits() (low, high, def float64) {
	if n.Limits != nil {
		return n.Limits()
	}
	return n.Min, n.Max, n.Default
}

func (n Numeric) read(p Param) (any, error) {
	low, high, def := n.limits()
	v := p.Value
	switch p.Kind {
	case Character:
		words := map[string]float64{"MIN": low, "MAX": high, "DEF": def}
		for _, w := range []string{"MINimum", "MAXimum", "DEFault"} {
			if sameWord(w, p.Text) {
				return words[w[:3]], nil
			}
		}
		if w, ok := pick(n.Words, p.Text); ok {
			return w, nil
		}
		return nil, wordFault(p, len(n.Words) > 0)
	case Decimal:
		factor, err := multiplier(p.Suffix, n.Unit)
		if err != nil {
			return nil, err
		}
		v *= factor
	case NonDecimal:
	default:
		return nil, notAllowed(p)
	}
	if n.Integer {
		v = math.Round(v)
	}
	if !(v >= low && v <= high) {
		return nil, NewFault(DataOutOfRange, p.Text+p.Suffix)
	}
	return v, nil
}

// wordFault tells a wrong word where words are taken from a word where none
// is: -224 and -148.
func wordFault(p Param, takesWords bool) error {
	if takesWords {
		return NewFault(IllegalParameter, p.Text)
	}
	return notAllowed(p)
}

func (l limitWord) read(p Param) (any, error) {
	if p.Kind != Character {
		return nil, notAllowed(p)
	}
	l.Words = nil
	return l.Numeric.read(p)
}

func (Boolean) read(p Param) (any, error) {
	switch p.Kind {
	case Decimal, NonDecimal:
		if p.Suffix != "" {
			return nil, NewFault(SuffixNotAllowed, p.Suffix)
		}
		return math.Round(p.Value) != 0, nil
	case Character:
		if w, ok := pick([]string{"OFF", "ON"}, p.Text); ok {
			return w == "ON", nil
		}
		return nil, NewFault(IllegalParameter, p.Text)
	}
	return nil, notAllowed(p)
}

func (c Choice) read(p Param) (any, error) {
	if p.Kind != Character {
		return nil, notAllowed(p)
	}
	w, ok := pick(c.Words, p.Text)
	if !ok {
		return nil, NewFault(IllegalParameter, p.Text)
	}
	return w, nil
}

func (Text) read(p Param) (any, error) {
	if p.Kind != Quoted {
		return nil, notAllowed(p)
	}
	return p.Text, nil
}

func (d Data) read(p Param) (any, error) {
	switch {
	case p.Kind != Block:
		return nil, notAllowed(p)
	case d.Max > 0 && len(p.Bytes) > d.Max:
		return nil, NewFault(TooMuchData, fmt.Sprintf("%d bytes, at most %d", len(p.Bytes), d.Max))
	}
	return p.Bytes, nil
}

func (Expr) read(p Param) (any, error) {
	if p.Kind != Expression {
		return nil, notAllowed(p)
	}
	return p.Text, nil
}

// sameWord compares a word of a table, short form in capitals, with one as
// sent, in capitals.
func sameWord(word, sent string) bool {
	short := strings.TrimRightFunc(word, func(r rune) bool { return r >= 'a' && r <= 'z' })
	return sent == short || sent == strings.ToUpper(word)
}

// pick finds the word that was sent and gives its short form.
func pick(words []string, sent string) (short string, ok bool) {
	for _, w := range words {
		if sameWord(w, sent) {
			return strings.TrimRightFunc(w, func(r rune) bool { return r >= 'a' && r <= 'z' }), true
		}
	}
	return "", false
}

// multipliers are the prefixes of IEEE 488.2 table 7-2 (HP 86140A manual,
// Remote Operation; P from memory).
var multipliers = map[string]float64{"": 1, "EX": 1e18, "PE": 1e15, "T": 1e12, "G": 1e9, "MA": 1e6, "K": 1e3,
	"M": 1e-3, "U": 1e-6, "N": 1e-9, "P": 1e-12, "F": 1e-15, "A": 1e-18}

// multiplier reads a suffix such as MV. M is milli, except before HZ and OHM,
// where it is mega; mega volts is MAV (Siglent SDM3055 remote manual p. 2).
func multiplier(suffix, unit string) (float64, error) {
	switch {
	case suffix == "":
		return 1, nil
	case unit == "":
		return 0, NewFault(SuffixNotAllowed, suffix)
	}
	prefix, found := strings.CutSuffix(suffix, unit)
	factor, known := multipliers[prefix]
	if !found || !known {
		return 0, NewFault(InvalidSuffix, suffix)
	}
	if prefix == "M" && (unit == "HZ" || unit == "OHM") {
		factor = 1e6
	}
	return factor, nil
}

func (c Channels) read(p Param) (any, error) {
	if p.Kind != Expression {
		return nil, notAllowed(p)
	}
	list, found := strings.CutPrefix(strings.TrimSpace(p.Text), "@")
	if !found {
		return nil, NewFault(InvalidExpression, p.Text)
	}
	var channels []int
	for _, part := range strings.Split(list, ",") {
		first, last, span := strings.Cut(part, ":")
		from, err := strconv.Atoi(strings.TrimSpace(first))
		to := from
		if err == nil && span {
			to, err = strconv.Atoi(strings.TrimSpace(last))
		}
		switch {
		case err != nil:
			return nil, NewFault(InvalidExpression, p.Text)
		case from < 1 || to < 1 || from > c.Max || to > c.Max:
			return nil, NewFault(DataOutOfRange, p.Text)
		}
		channels = append(channels, steps(from, to)...)
	}
	return channels, nil
}

// steps counts from one to the other, in either direction.
func steps(from, to int) (all []int) {
	step := 1
	if to < from {
		step = -1
	}
	for n := from; ; n += step {
		if all = append(all, n); n == to {
			return all
		}
	}
}
