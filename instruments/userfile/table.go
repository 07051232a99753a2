package userfile

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// Table is one table of a file. Every getter marks its key as known, tells
// whether it was there and good, and notes a mistake where it was not. A table
// that is not there answers every getter with false and no further mistakes.
type Table struct {
	file     *File
	node     *node
	path     string
	asked    map[string]bool     // key: true where it is accepted, false where it is refused
	tables   map[string][]*Table // handed out, by key
	optional bool                // a missing key is no mistake
	absent   bool
}

// Optional is the same table, where a missing key is no mistake.
func (t *Table) Optional() *Table {
	o := *t
	o.optional = true
	return &o
}

// Present tells whether the table is in the file.
func (t *Table) Present() bool { return !t.absent }

// Path is the table's name as messages give it: "meter[2]".
func (t *Table) Path() string { return t.path }

// Line is where the table begins, or where the key stands that is given.
func (t *Table) Line(key ...string) int {
	for _, k := range key {
		if n, ok := t.node.under[k]; ok {
			return n.line
		}
	}
	return t.node.line
}

// Has tells whether a key is there. It does not make the key known.
func (t *Table) Has(key string) bool { _, ok := t.node.under[key]; return ok }

// Keys are the keys that are there, in the order written.
func (t *Table) Keys() []string { return append([]string(nil), t.node.keys...) }

// IsTable tells whether a key holds a table, in braces or by header.
func (t *Table) IsTable(key string) bool {
	n, ok := t.node.under[key]
	return ok && n.kind == unstable.Table
}

// IsNumber tells whether a key holds a bare number.
func (t *Table) IsNumber(key string) bool {
	n, ok := t.node.under[key]
	return ok && (n.kind == unstable.Integer || n.kind == unstable.Float)
}

// Known marks keys as known without reading them: where another mistake decides whether they make sense.
func (t *Table) Known(keys ...string) {
	for _, k := range keys {
		t.asked[k] = true
	}
}

// Table is the table under a key: [key], or key = { … }. It is never nil.
func (t *Table) Table(key string) *Table {
	n, ok := t.find(key, "the table ["+dotted(t.path, key)+"] is missing")
	if ok && n.kind != unstable.Table {
		t.Fail(key, "is "+n.kindWords()+" and has to be one table")
		ok = false
	}
	if !ok {
		return t.stub(dotted(t.path, key))
	}
	return t.handOut(key, n, dotted(t.path, key))
}

// Tables are the tables of [[key]], in the order written.
func (t *Table) Tables(key string) []*Table {
	n, ok := t.find(key, "at least one [["+dotted(t.path, key)+"]] is needed")
	if ok && n.kind != unstable.ArrayTable {
		t.Fail(key, fmt.Sprintf("is %s; write it as [[%s]]", n.kindWords(), dotted(t.path, key)))
		ok = false
	}
	if !ok {
		return nil
	}
	var out []*Table
	for i, el := range n.items {
		out = append(out, t.handOut(key, el, fmt.Sprintf("%s[%d]", dotted(t.path, key), i+1)))
	}
	return out
}

// Look finds a table to point a message at: the only one, or element i (from 0)
// of an array of tables. It notes no mistake; a table that is not there has the line of t.
func (t *Table) Look(key string, i ...int) *Table {
	n, ok := t.node.under[key]
	path := dotted(t.path, key)
	if len(i) > 0 {
		path = fmt.Sprintf("%s[%d]", path, i[0]+1)
		if ok = ok && i[0] < len(n.items); ok {
			n = n.items[i[0]]
		}
	}
	if !ok || n.kind != unstable.Table {
		return t.stub(path)
	}
	return &Table{file: t.file, node: n, path: path, asked: map[string]bool{}, tables: map[string][]*Table{}}
}

// handOut makes the table of a node, or gives the one handed out before.
func (t *Table) handOut(key string, n *node, path string) *Table {
	for _, old := range t.tables[key] {
		if old.node == n {
			return old
		}
	}
	sub := &Table{file: t.file, node: n, path: path, asked: map[string]bool{}, tables: map[string][]*Table{}}
	t.tables[key] = append(t.tables[key], sub)
	return sub
}

// stub stands for a table that is not there.
func (t *Table) stub(path string) *Table {
	return &Table{file: t.file, node: newTable(t.node.line, byHeader), path: path,
		asked: map[string]bool{}, tables: map[string][]*Table{}, optional: true, absent: true}
}

// find marks a key as known and finds it, or notes that it is missing.
func (t *Table) find(key, missing string) (*node, bool) {
	t.asked[key] = true
	n, ok := t.node.under[key]
	if !ok && !t.optional {
		e := &failure{Error: t.mistake(key, missing), table: t.node, missing: key}
		t.file.errs = append(t.file.errs, e)
	}
	return n, ok
}

// mistake is an error at a key, with what was found there.
func (t *Table) mistake(key, want string) Error {
	e := Error{File: t.file.Name, Line: t.node.line, Key: t.path, Want: plain(want)}
	if key != "" {
		e.Key = dotted(t.path, key)
	}
	if n, ok := t.node.under[key]; ok {
		e.Line, e.Found = n.line, shown(n.raw)
	}
	return e
}

// Fail notes a mistake at a key, or with an empty key at the table itself.
// Want says what is wrong and what would do.
func (t *Table) Fail(key, want string) { t.fail(t.mistake(key, want)) }

// FailItem notes a mistake at one element of a list, counted from 0, or at the
// whole value where it is no list.
func (t *Table) FailItem(key string, i int, want string) { t.fail(t.itemMistake(key, i, want)) }

func (t *Table) itemMistake(key string, i int, want string) Error {
	n, ok := t.node.under[key]
	if ok && n.kind == unstable.Array && i >= 0 && i < len(n.items) {
		return t.at(key, n.items[i], plain(want))
	}
	return t.mistake(key, want)
}

// Correct notes a mistake whose correction is known: value is what should
// stand behind the key, quotes included.
func (t *Table) Correct(key, value, want string) {
	e := t.mistake(key, want)
	e.Fix = key + " = " + value
	t.fail(e)
}

// Suggest notes a mistake in one word of a key's value, text or list, and
// offers the nearest of the accepted words where there is one.
func (t *Table) Suggest(key, word string, accepted []string, want string) {
	e := t.itemMistake(key, t.index(key, word), want)
	if near := Nearest(word, accepted); near != "" {
		if e.Fix = t.replaced(key, strconv.Quote(word), strconv.Quote(near)); e.Fix == "" {
			e.Fix = t.replaced(key, word, near)
		}
	}
	t.fail(e)
}

// index is where a word stands in a list; -1 where it doesn't.
func (t *Table) index(key, word string) int {
	if n, ok := t.node.under[key]; ok {
		return slices.IndexFunc(n.items, func(el *node) bool { return el.text == word })
	}
	return -1
}

// Refuse notes a mistake if the key is there. The key is not named among the accepted ones.
func (t *Table) Refuse(key, why string) bool {
	if !t.Has(key) {
		return false
	}
	t.asked[key] = false
	t.Fail(key, why)
	return true
}

// NotYet refuses a key that this version does not support; instead says what would do.
func (t *Table) NotYet(key, instead string) bool {
	return t.Refuse(key, "not supported yet by this version; "+instead)
}

func (t *Table) fail(e Error) { t.file.errs = append(t.file.errs, &failure{Error: e}) }

// plain has ordinary spaces between numbers and units, so that a person can search for them and type them.
func plain(s string) string { return strings.ReplaceAll(s, "\u00a0", " ") }

// list joins words for a message: "a, b or c".
func list(words []string) string {
	if len(words) < 2 {
		return strings.Join(words, "")
	}
	return strings.Join(words[:len(words)-1], ", ") + " or " + words[len(words)-1]
}
