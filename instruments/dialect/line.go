package dialect

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Line is one command, query, or setting with its read-back.
type Line struct {
	Send     string
	Ask      string
	Reply    string
	Yes      []string
	No       []string
	Bit      int
	Base     string
	Want     []string
	Fields   []string
	Unit     string   // a unit the reply carries behind its number
	Scale    float64  // factor from the reply to SI; 0 means 1
	Overload []string // whole replies that mean overload, beside 9.9E37
	NoValue  []string // whole replies that mean that there is no value, beside 9.91E37
	Infinity string   // what 9.9E37 means: overload, or "no measurement"
	Within   float64  // likewise, as a share of it
	Source   string
	Note     string

	Name string
	Step float64 // in SI: how far a setting read back may be from the one asked
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

// Put is what is put in for {value} and {channel}.
type Put struct {
	Value   float64
	Channel int
}

// Fill puts the values in.
func (p Put) Fill(text string) string {
	return strings.NewReplacer("{value}", Number(p.Value), "{channel}", strconv.Itoa(p.Channel)).Replace(text)
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

// Checked is false for a line written from memory.
func (l Line) Checked() bool { return l.Source != "unchecked" }

// placeholders finds the {…} of a text.
func placeholders(text string) (names []string, err error) {
	for rest := text; ; {
		_, after, ok := strings.Cut(rest, "{")
		if !ok {
			return names, nil
		}
		name, tail, ok := strings.Cut(after, "}")
		if !ok {
			return nil, fmt.Errorf("a { without its }")
		}
		names = append(names, name)
		rest = tail
	}
}
