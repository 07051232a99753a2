package userfile

import (
	"encoding"
	"strconv"

	"github.com/pelletier/go-toml/v2/unstable"
)

// Texts reads a list of values that read themselves, at least one.
func Texts[T any, P interface {
	*T
	encoding.TextUnmarshaler
}](t *Table, key string, v *[]T) bool {
	items, ok := t.items(key)
	if !ok {
		return false
	}
	out := make([]T, len(items))
	for i, n := range items {
		if !n.textual() {
			return t.wrong(key, n, "text in quotes")
		}
		if !t.unmarshal(key, n, P(&out[i])) {
			return false
		}
	}
	*v = out
	return true
}

// Pairs reads a list of pairs of values that read themselves: [["100 mA", "1.7 V"], …].
func Pairs[A, B any, PA interface {
	*A
	encoding.TextUnmarshaler
}, PB interface {
	*B
	encoding.TextUnmarshaler
}](t *Table, key string, add func(A, B)) bool {
	items, ok := t.items(key)
	if !ok {
		return false
	}
	for _, n := range items {
		if n.kind != unstable.Array || len(n.items) != 2 || !n.items[0].textual() || !n.items[1].textual() {
			return t.wrong(key, n, `a list of pairs, like [["10 mA", "1.4 V"], ["100 mA", "1.7 V"]]`)
		}
		var a A
		var b B
		if !t.unmarshal(key, n.items[0], PA(&a)) || !t.unmarshal(key, n.items[1], PB(&b)) {
			return false
		}
		add(a, b)
	}
	return true
}

// Strings reads a list of texts, at least one.
func (t *Table) Strings(key string, v *[]string) bool {
	items, ok := t.items(key)
	if !ok {
		return false
	}
	var out []string
	for _, n := range items {
		if n.kind != unstable.String {
			return t.wrong(key, n, "text in quotes")
		}
		out = append(out, n.text)
	}
	*v = out
	return true
}

// Ints reads a list of whole numbers from low to high, at least one.
func (t *Table) Ints(key string, v *[]int, low, high int) bool {
	items, ok := t.items(key)
	if !ok {
		return false
	}
	var out []int
	for _, n := range items {
		x, good := n.integer()
		if !good || x < low || x > high {
			return t.wrong(key, n, "whole numbers from "+strconv.Itoa(low)+" to "+strconv.Itoa(high))
		}
		out = append(out, x)
	}
	*v = out
	return true
}

// items are the elements of a list, at least one.
func (t *Table) items(key string) ([]*node, bool) {
	n, ok := t.find(key, missing)
	if !ok {
		return nil, false
	}
	if n.kind != unstable.Array {
		return nil, t.wrong(key, n, "a list in square brackets")
	}
	if len(n.items) == 0 {
		t.Fail(key, "the list is empty; give at least one")
		return nil, false
	}
	return n.items, true
}
