package userfile

import (
	"bytes"
	"errors"
	"fmt"
	"regexp"
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// maxDepth bounds nested lists and inline tables; the deepest file needs 3.
const maxDepth = 16

// tree builds the nodes of one document.
type tree struct {
	name string
	data []byte
	ends []int // offsets of the ends of lines
	p    unstable.Parser
	root *node
	here *node  // table that key-values go to
	path string // of here, for messages
}

// parse reads a document up to its first mistake of form.
func parse(name string, data []byte) (*node, *Error) {
	root := newTable(1, byHeader)
	t := &tree{name: name, data: data, ends: lineEnds(data), root: root, here: root}
	t.p.Reset(data)
	for t.p.NextExpression() {
		if err := t.expression(t.p.Expression()); err != nil {
			return nil, err
		}
	}
	if err := t.p.Error(); err != nil {
		return nil, t.syntax(err)
	}
	return root, nil
}

func (t *tree) expression(e *unstable.Node) *Error {
	switch e.Kind {
	case unstable.Table, unstable.ArrayTable:
		return t.header(e)
	case unstable.KeyValue:
		return t.keyValue(t.here, t.path, e, 0)
	}
	return nil
}

// header moves to the table of [a.b] or to a new element of [[a.b]].
func (t *tree) header(e *unstable.Node) *Error {
	keys := keysOf(e)
	at, path, line := t.root, "", t.line(int(keys[0].Raw.Offset))
	for i, k := range keys {
		name, last := string(k.Data), i == len(keys)-1
		path = dotted(path, name)
		next, ok := at.under[name]
		switch {
		case !ok && last && e.Kind == unstable.ArrayTable:
			next = &node{kind: unstable.ArrayTable, line: line}
			at.put(name, next)
		case !ok:
			next = newTable(line, byPath)
			at.put(name, next)
		}
		if last {
			var err *Error
			if next, err = t.open(next, e.Kind, path, line); err != nil {
				return err
			}
			if e.Kind == unstable.ArrayTable {
				path = fmt.Sprintf("%s[%d]", path, len(at.under[name].items))
			}
		} else if next.kind == unstable.ArrayTable {
			path = fmt.Sprintf("%s[%d]", path, len(next.items))
			next = next.items[len(next.items)-1]
		}
		if next.kind != unstable.Table || next.made == byBraces {
			return t.again(path, line, next.line)
		}
		at = next
	}
	t.here, t.path = at, path
	return nil
}

// open claims n for a header of the given kind: a table once, an array of tables any number of times.
func (t *tree) open(n *node, kind unstable.Kind, path string, line int) (*node, *Error) {
	switch {
	case kind == unstable.ArrayTable && n.kind == unstable.ArrayTable:
		el := newTable(line, byElement)
		n.items = append(n.items, el)
		return el, nil
	case kind == unstable.Table && n.kind == unstable.Table && n.made == byPath:
		n.made, n.line = byHeader, line
		return n, nil
	}
	return nil, t.again(path, line, n.line)
}

// keyValue adds one key = value, the key perhaps dotted, to a table.
func (t *tree) keyValue(at *node, path string, e *unstable.Node, depth int) *Error {
	keys := keysOf(e)
	line := t.line(int(keys[0].Raw.Offset))
	for _, k := range keys[:len(keys)-1] {
		path = dotted(path, string(k.Data))
		next, ok := at.under[string(k.Data)]
		if !ok {
			next = newTable(line, byDots)
			at.put(string(k.Data), next)
		}
		if next.kind != unstable.Table || next.made != byDots {
			return t.again(path, line, next.line)
		}
		at = next
	}
	last := keys[len(keys)-1]
	path = dotted(path, string(last.Data))
	if old, ok := at.under[string(last.Data)]; ok {
		err := t.again(path, line, old.line)
		err.Found = shown(t.written(e, last))
		return err
	}
	v, err := t.value(e.Value(), path, line, depth)
	if err != nil {
		return err
	}
	v.raw = t.written(e, last)
	at.put(string(last.Data), v)
	return nil
}

// value copies a value out of the parser, which reuses its memory.
func (t *tree) value(n *unstable.Node, path string, line, depth int) (*node, *Error) {
	if depth > maxDepth {
		return nil, &Error{File: t.name, Line: line, Key: path, Want: fmt.Sprintf("nested more than %d deep; no key needs that", maxDepth)}
	}
	if n.Raw.Length > 0 {
		line = t.line(int(n.Raw.Offset))
	}
	v := &node{kind: n.Kind, line: line, text: string(n.Data), raw: string(t.p.Raw(n.Raw))}
	switch n.Kind {
	case unstable.Array:
		for it := n.Children(); it.Next(); {
			el, err := t.value(it.Node(), path, line, depth+1)
			if err != nil {
				return nil, err
			}
			v.items = append(v.items, el)
		}
	case unstable.InlineTable:
		v = newTable(line, byBraces)
		for it := n.Children(); it.Next(); {
			if err := t.keyValue(v, path, it.Node(), depth+1); err != nil {
				return nil, err
			}
		}
	}
	return v, nil
}

// written is the value of a key-value as it stands in the file.
func (t *tree) written(e, last *unstable.Node) string {
	end := int(e.Raw.Offset + e.Raw.Length)
	s := string(t.data[last.Raw.Offset+last.Raw.Length : end])
	_, s, _ = strings.Cut(s, "=")
	return strings.TrimSpace(s)
}

func (t *tree) again(path string, line, before int) *Error {
	return &Error{File: t.name, Line: line, Key: path, Want: fmt.Sprintf("already given on line %d; keep one of the two", before)}
}

// unquoted finds a value that only lacks its quotes: max_voltage = 13 V.
var unquoted = regexp.MustCompile(`^\s*([A-Za-z0-9_-]+)\s*=\s*([^\s"'\[{#][^"'\[{#]*)`)

// syntax turns the parser's error into ours.
func (t *tree) syntax(err error) *Error {
	out := &Error{File: t.name, Line: 1 + len(t.ends), Want: err.Error(), Err: err}
	var pe *unstable.ParserError
	if !errors.As(err, &pe) {
		return out
	}
	off := cap(t.data) - cap(pe.Highlight)
	if off < 0 || off > len(t.data) {
		return out
	}
	out.Line = t.line(off)
	line := t.text(off)
	out.Found = shown(line)
	if out.Found != "" {
		out.Want = fmt.Sprintf("%q is not TOML: %s", out.Found, pe.Message)
	}
	if m := unquoted.FindStringSubmatch(line); m != nil {
		out.Key, out.Found = dotted(t.path, m[1]), shown(m[2])
		out.Want = "text and quantities stand in quotes"
		out.Fix = fmt.Sprintf("%s = %q", m[1], strings.TrimSpace(m[2]))
	}
	return out
}

// line is the number of the line that byte offset is on, from 1.
func (t *tree) line(offset int) int {
	n, _ := slices.BinarySearch(t.ends, offset)
	return n + 1
}

func lineEnds(data []byte) []int {
	var ends []int
	for i, b := range data {
		if b == '\n' {
			ends = append(ends, i)
		}
	}
	return ends
}

// text is the line that byte offset is on.
func (t *tree) text(offset int) string {
	start := bytes.LastIndexByte(t.data[:offset], '\n') + 1
	rest, _, _ := bytes.Cut(t.data[start:], []byte("\n"))
	return strings.TrimSpace(string(rest))
}

func keysOf(e *unstable.Node) []*unstable.Node {
	var keys []*unstable.Node
	for it := e.Key(); it.Next(); {
		keys = append(keys, it.Node())
	}
	return keys
}

func dotted(path, key string) string {
	if path == "" {
		return key
	}
	return path + "." + key
}
