package userfile

import "github.com/pelletier/go-toml/v2/unstable"

// origin says how a table came to be, which decides what may be added to it (TOML 1.0, "Table" and "Keys").
type origin int

const (
	byHeader  origin = iota // [a]: its own header
	byPath                  // a in [a.b]: may still get its own header
	byDots                  // a in a.b = 1: may get more dotted keys, no header
	byBraces                // a = { … }: complete
	byElement               // one [[a]]
)

// node is a value with its place in the file.
type node struct {
	kind  unstable.Kind // Table, ArrayTable, Array, or that of a scalar
	line  int
	text  string // scalars: decoded
	raw   string // as written
	items []*node
	made  origin           // Table only
	keys  []string         // Table only, in the order written
	under map[string]*node // Table only
}

func newTable(line int, made origin) *node {
	return &node{kind: unstable.Table, line: line, made: made, under: map[string]*node{}}
}

func (n *node) put(key string, child *node) {
	n.keys = append(n.keys, key)
	n.under[key] = child
}

// kindWords name what was found, for messages.
func (n *node) kindWords() string {
	switch n.kind {
	case unstable.Table:
		return "a table"
	case unstable.ArrayTable:
		return "several tables"
	case unstable.Array:
		return "a list"
	case unstable.String:
		return "text"
	case unstable.Bool:
		return "true or false"
	case unstable.Integer, unstable.Float:
		return "a number"
	}
	return "a date or time"
}
