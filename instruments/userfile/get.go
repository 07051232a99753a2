package userfile

import (
	"encoding"
	"math"
	"strconv"
	"strings"
	"time"

	"github.com/pelletier/go-toml/v2/unstable"
)

const missing = "is missing"

// Text reads a value that reads itself: quantities above all. A bare number is
// passed as its digits; whether that will do is the value's business.
func (t *Table) Text(key string, v encoding.TextUnmarshaler) bool {
	n, ok := t.find(key, missing)
	if !ok {
		return false
	}
	if !n.textual() {
		return t.wrong(key, n, "text in quotes")
	}
	return t.unmarshal(key, n, v)
}

// String reads text that is not empty.
func (t *Table) String(key string, v *string) bool {
	n, ok := t.find(key, missing)
	switch {
	case !ok:
		return false
	case n.kind == unstable.Integer || n.kind == unstable.Float:
		t.Correct(key, strconv.Quote(n.text), "give text in quotes")
		return false
	case n.kind != unstable.String:
		return t.wrong(key, n, "text in quotes")
	case strings.TrimSpace(n.text) == "":
		t.Fail(key, "is empty")
		return false
	}
	*v = n.text
	return true
}

// Word reads one of the accepted words.
func Word[T ~string](t *Table, key string, v *T, accepted ...T) bool {
	var s string
	if !t.String(key, &s) {
		return false
	}
	words := make([]string, len(accepted))
	for i, a := range accepted {
		if words[i] = string(a); words[i] == s {
			*v = a
			return true
		}
	}
	t.Suggest(key, s, words, "use "+list(words))
	return false
}

// Int reads a whole number from low to high.
func (t *Table) Int(key string, v *int, low, high int) bool {
	n, ok := t.find(key, missing)
	if !ok {
		return false
	}
	x, good := n.integer()
	if !good || x < low || x > high {
		return t.wrong(key, n, "a whole number from "+strconv.Itoa(low)+" to "+strconv.Itoa(high))
	}
	*v = x
	return true
}

// Number reads a finite number, whole or not, whose key gives the unit.
func (t *Table) Number(key string, v *float64) bool {
	n, ok := t.find(key, missing)
	if !ok {
		return false
	}
	x, err := strconv.ParseFloat(strings.ReplaceAll(n.text, "_", ""), 64)
	if (n.kind != unstable.Integer && n.kind != unstable.Float) || err != nil || math.IsNaN(x) || math.IsInf(x, 0) {
		return t.wrong(key, n, "a number without quotes")
	}
	*v = x
	return true
}

// Bool reads true or false.
func (t *Table) Bool(key string, v *bool) bool {
	n, ok := t.find(key, missing)
	if !ok {
		return false
	}
	if n.kind != unstable.Bool {
		return t.wrong(key, n, "true or false, without quotes")
	}
	*v = n.text == "true"
	return true
}

// Date reads a calendar date, with or without quotes, as ISO 8601 writes it: 2026-03-01.
func (t *Table) Date(key string, v *string) bool {
	n, ok := t.find(key, missing)
	if !ok {
		return false
	}
	if _, err := time.Parse(time.DateOnly, n.text); err != nil || (n.kind != unstable.String && n.kind != unstable.LocalDate) {
		return t.wrong(key, n, `a date like "2026-03-01"`)
	}
	*v = n.text
	return true
}

// textual tells whether Text may pass the node on.
func (n *node) textual() bool {
	return n.kind == unstable.String || n.kind == unstable.Integer || n.kind == unstable.Float
}

func (n *node) integer() (int, bool) {
	if n.kind != unstable.Integer {
		return 0, false
	}
	x, err := strconv.ParseInt(strings.ReplaceAll(n.text, "_", ""), 0, 64)
	return int(x), err == nil
}

// wrong notes a value of the wrong kind. It is always false.
func (t *Table) wrong(key string, n *node, want string) bool {
	t.fail(t.at(key, n, "give "+want))
	return false
}

// at is a mistake at an element of a key's value.
func (t *Table) at(key string, n *node, want string) Error {
	e := t.mistake(key, want)
	e.Line = n.line
	if n.raw != "" {
		e.Found = shown(n.raw)
	}
	return e
}

// unmarshal lets a value read itself and puts its complaint at the key.
func (t *Table) unmarshal(key string, n *node, v encoding.TextUnmarshaler) bool {
	text := n.text
	if n.kind != unstable.String {
		text = strings.ReplaceAll(text, "_", "")
	}
	err := v.UnmarshalText([]byte(text))
	if err == nil {
		return true
	}
	e := t.at(key, n, plain(err.Error()))
	e.Err = err
	if fixed := withUnit(text, v); fixed != "" {
		e.Fix = t.replaced(key, n.raw, strconv.Quote(fixed))
	}
	t.fail(e)
	return false
}

// replaced is the line of a key with one part of its value replaced; empty
// where the value has several lines or the part stands in it more than once.
func (t *Table) replaced(key, old, new string) string {
	raw := t.node.under[key].raw
	if old == "" || strings.Contains(raw, "\n") || strings.Count(raw, old) != 1 {
		return ""
	}
	return key + " = " + strings.Replace(raw, old, new, 1)
}

// units are tried behind a bare number, the commonest of each kind of quantity
// first; % stands in front for limits, which take several.
var units = []string{" %", " V", " A", " s", " Hz", " W", " degC", " mN m", " mV s/rad", " uN m s", " nN m s2", " g cm2"}

// withUnit is a bare number with the unit that it lacks, or empty.
func withUnit(text string, v encoding.TextUnmarshaler) string {
	text = strings.TrimSpace(text)
	if _, err := strconv.ParseFloat(text, 64); err != nil {
		return ""
	}
	for _, u := range units {
		if v.UnmarshalText([]byte(text+u)) == nil {
			return text + u
		}
	}
	return ""
}
