package bench

import (
	"fmt"

	"nightbench/instruments"
	"nightbench/instruments/userfile"
)

// earthed is a node that an instrument connects to protective earth.
type earthed struct {
	table *userfile.Table
	key   string
	node  instruments.Node
}

// earthedOf reads whether an instrument is earthed; a scope has to say so.
func earthedOf(t *userfile.Table, required bool) bool {
	var earthed bool
	if !required {
		t = t.Optional()
	}
	t.Bool("earthed", &earthed)
	return earthed
}

// onEarth notes that a key of a table connects a node to earth.
func (r *reader) onEarth(t *userfile.Table, key string, n instruments.Node) {
	r.earth = append(r.earth, earthed{t, key, n})
}

// oneEarth refuses two different nodes on earth: they would be joined through
// the protective conductor, across whatever lies between them. Every node too many is told once.
func (r *reader) oneEarth() {
	told := map[instruments.Node]bool{}
	for _, e := range r.earth {
		first := r.earth[0]
		if e.node == first.node || told[e.node] {
			continue
		}
		told[e.node] = true
		e.table.Fail(e.key, fmt.Sprintf("%s on %s and %s on %s (line %d) are both earthed: together they short out whatever lies between; move one, or use an instrument that is not earthed",
			e.table.Path(), e.node, first.table.Path(), first.node, first.table.Line(first.key)))
	}
}
