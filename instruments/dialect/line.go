package dialect

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"
)

// Line is one command, query, or setting with its read-back.
//
// reply says what the answer is:
//
//	number     (the default) with unit (a suffix it may carry), scale (factor to SI), overload and no_value
//	           (whole replies), infinity (what 9.9E37 means)
//	bool       yes and no: the words for it; 1 and 0 where none are stated
//	bit        of a number: bit, or bits (one a channel); base decimal, hex, or binary (text of 0 and 1,
//	           bit 0 last), or characters (bit counts characters from the left, from 0); yes_is = 0 where
//	           a 0 means yes
//	text       want: the answers that will do
//	numbers    fields: their names in order, "-" for one that is not wanted
//	block      an arbitrary block
//
// before lists messages that are sent before ask, to choose what is asked for.
// prefix lists headers that may stand before the answer, and field (from 1)
// picks one part of an answer at separator, a comma where none is stated.
//
// A setting may have choices, pairs of value and word, or series = "1-2-5",
// for instruments that take no other: the next one up is sent. decimals is how
// many places are sent. step and within say by how much a setting read back
// may differ. rest is how long the instrument needs before the next message.
type Line struct {
	Send      string
	Ask       string
	Reply     string
	Yes       []string
	No        []string
	Bits      []int
	Base      string
	YesIs     int
	Want      []string
	Fields    []string
	Before    []string // messages sent before ask
	Prefix    []string
	Field     int
	Separator string
	Unit      string
	Scale     float64  // factor from the reply to SI; 0 means 1
	Overload  []string // beside 9.9E37
	NoValue   []string // beside 9.91E37
	Infinity  string   // overload, or "no measurement"
	Choices   []Choice
	Series    bool // 1-2-5
	Decimals  int  // -1: as many as there are
	Within    float64
	Rest      time.Duration
	Source    string
	AskSource string // of the query and the form of its reply, where it is not Source
	Note      string

	Name string
	Step float64 // in SI: how far a setting read back may be from the one asked
}

// Choice is a value an instrument offers and its word for it.
type Choice struct {
	Value float64
	Word  string
}

// The kinds of reply.
const (
	ReplyNumber  = "number"
	ReplyBool    = "bool"
	ReplyBit     = "bit"
	ReplyText    = "text"
	ReplyNumbers = "numbers"
	ReplyBlock   = "block"
)

// Put is what is put in for {value} and {channel}: a number, or a word or name
// in its place.
type Put struct {
	Value   float64
	Word    string
	Channel int
	Name    string
}

// Fill puts the values in.
func (p Put) Fill(text string) string {
	value, channel := p.Word, p.Name
	if value == "" {
		value = Number(p.Value)
	}
	if channel == "" {
		channel = strconv.Itoa(p.Channel)
	}
	return strings.NewReplacer("{value}", value, "{channel}", channel).Replace(text)
}

// Settle is what is sent for a value: the next choice or the next of the
// series up, rounded to the places that are sent. It fails above the highest choice.
func (l Line) Settle(p Put) (Put, error) {
	switch {
	case len(l.Choices) > 0:
		best, found := l.Highest(), false
		for _, c := range l.Choices {
			if c.Value >= p.Value*(1-1e-9) && (!found || c.Value < best.Value) {
				best, found = c, true
			}
		}
		if !found {
			return p, fmt.Errorf("%w: %s is above the highest choice, %s", ErrCannot, Number(p.Value), Number(best.Value))
		}
		p.Value, p.Word = best.Value, best.Word
	case l.Series && p.Value > 0:
		p.Value = next125(p.Value)
	case l.Decimals >= 0 && l.Send != "":
		places := math.Pow10(l.Decimals)
		p.Value = math.Round(p.Value*places) / places
	}
	return p, nil
}

// Highest is the highest choice.
func (l Line) Highest() (best Choice) {
	for n, c := range l.Choices {
		if n == 0 || c.Value > best.Value {
			best = c
		}
	}
	return best
}

// Chosen is the value of a choice by its word, which may also be a number
// spelt otherwise.
func (l Line) Chosen(word string) (float64, bool) {
	x, err := strconv.ParseFloat(word, 64)
	for _, c := range l.Choices {
		y, err2 := strconv.ParseFloat(c.Word, 64)
		if strings.EqualFold(c.Word, word) || err == nil && err2 == nil && math.Abs(x-y) <= 1e-6*math.Abs(y) {
			return c.Value, true
		}
	}
	return 0, false
}

// next125 is the next of 1, 2, 5, 10 … at or above x.
func next125(x float64) float64 {
	exponent := int(math.Floor(math.Log10(x)))
	for _, m := range []string{"1", "2", "5", "10"} {
		v, _ := strconv.ParseFloat(m+"e"+strconv.Itoa(exponent), 64) // exact where a product would not be
		if v >= x*(1-1e-9) {
			return v
		}
	}
	return x
}

// Number spells a number for an instrument: plain base units with nine
// significant digits, no exponent and no suffix ("0.005"), since M means milli
// before one unit and mega before another.
func Number(x float64) string {
	if x == 0 {
		return "0"
	}
	digits := min(max(8-int(math.Floor(math.Log10(math.Abs(x)))), 0), 18)
	s := strconv.FormatFloat(x, 'f', digits, 64)
	if strings.Contains(s, ".") {
		s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	}
	return s
}

// Agrees tells whether a setting read back is the one asked for, within the
// line's step or share, whichever is larger, or a millionth where neither is stated.
func (l Line) Agrees(asked, found float64) bool {
	allowed := max(l.Step, l.Within*math.Abs(asked), 1e-6*math.Abs(asked))
	return math.Abs(found-asked) <= allowed*(1+1e-9)
}

// Checked is false for a line of which a half is written from memory.
func (l Line) Checked() bool { return l.Source != Unchecked && l.AskSource != Unchecked }

// Bit is the bit or character that is meant on a channel, from 1.
func (l Line) Bit(channel int) int {
	if len(l.Bits) == 0 {
		return 0
	}
	return l.Bits[min(max(channel, 1), len(l.Bits))-1]
}

// Answer is what a reply holds: without a header that may stand before it, and
// the part that is meant where it has several.
func (l Line) Answer(p Put, reply string) (string, error) {
	answer := strings.TrimSpace(reply)
	for _, prefix := range l.Prefix {
		head := p.Fill(prefix)
		if len(answer) >= len(head) && strings.EqualFold(answer[:len(head)], head) {
			answer = strings.TrimSpace(answer[len(head):])
			break
		}
	}
	if l.Field == 0 {
		return answer, nil
	}
	parts := strings.Split(answer, l.Separator)
	if len(parts) < l.Field {
		return "", fmt.Errorf("%q has %d parts, part %d was wanted", reply, len(parts), l.Field)
	}
	return strings.TrimSpace(parts[l.Field-1]), nil
}
