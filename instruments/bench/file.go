// Package bench reads the bench file, which says what instruments there are, how
// they are reached and how they are wired to the board, and opens them.
package bench

import (
	"encoding"
	"errors"
	"fmt"
	"slices"
	"strings"

	"nightbench/instruments"
	"nightbench/instruments/link"
	"nightbench/instruments/si"
	"nightbench/instruments/userfile"
)

// Port is where an instrument is reached and how it is spoken to.
type Port struct {
	Address link.Address
	Dialect string // "auto": by identity; else a dialect's name, or the path of the user's own file
	Channel int    // supply only: the channel of the supply, from 1
	Serial  string // the serial number that has to answer; empty: any
}

// Auto is the dialect of an instrument that is recognised by its identity.
const Auto = "auto"

// File is a bench file, read and checked. What is not on the bench is nil.
type File struct {
	Wiring instruments.Wiring
	Pace   float64 // of a practice bench; 1 on a real one
	Line   float64 // Hz, of the power line that apertures are counted in
	Supply Port
	Meters []Port // in the order of Wiring.Meters
	Scope  *Port
	Pot    *Port
	Cutoff *Port

	Path string // file it was read from
	Text string // verbatim
}

// Read reads a bench file. Every mistake in it is reported, with its line. No port is opened.
func Read(path string) (*File, error) {
	f, err := userfile.Read(path)
	if err != nil {
		return nil, err
	}
	return fileOf(f)
}

// Parse reads a copy of a bench file kept with a run: the name is for messages only.
func Parse(name, text string) (*File, error) {
	f, err := userfile.Parse(name, []byte(text))
	if err != nil {
		return nil, err
	}
	return fileOf(f)
}

func fileOf(f *userfile.File) (*File, error) {
	r := reader{file: f, out: &File{Path: f.Name, Text: f.Source, Pace: 1, Line: 50}}
	r.bench(f.Table("bench"))
	r.supply(f.Table("supply"))
	for _, t := range f.Optional().Tables("meter") {
		r.meter(t)
	}
	r.scope(f.Optional().Table("scope"))
	r.pot(f.Optional().Table("pot"))
	r.cutoff(f.Optional().Table("cutoff"))
	r.onePortEach()
	r.oneEarth()
	if err := f.Err(); err != nil {
		return nil, err
	}
	return r.out, nil
}

// reader collects what the checks across instruments need.
type reader struct {
	file  *userfile.File
	out   *File
	ports []placedPort
	earth []earthed
}

// placedPort is a port and the table it came from.
type placedPort struct {
	table *userfile.Table
	addr  link.Address
}

func (r *reader) bench(t *userfile.Table) {
	w := &r.out.Wiring
	t.String("name", &w.Bench)
	t.Optional().Bool("practice", &w.Practice)
	r.powerLine(t)
	if !t.Optional().Number("pace", &r.out.Pace) {
		return
	}
	switch {
	case !w.Practice:
		t.Fail("pace", "only a practice bench can be sped up; remove the line, or add practice = true if the instruments are simulated")
	case r.out.Pace < 0.1 || r.out.Pace > 10_000:
		t.Fail("pace", "give how many times as fast as the wall bench time runs, from 0.1 to 10000, like 20")
	}
}

// powerLine reads the frequency of the power line, which meters count their apertures in.
func (r *reader) powerLine(t *userfile.Table) {
	var f si.Frequency
	if !t.Optional().Text("line_frequency", &f) {
		return
	}
	if r.out.Line = f.SI(); r.out.Line != 50 && r.out.Line != 60 {
		t.Fail("line_frequency", `give "50 Hz" or "60 Hz"`)
	}
}

// port reads address and dialect, common to all instruments.
func (r *reader) port(t *userfile.Table) Port {
	p := Port{Dialect: Auto}
	t.Optional().String("dialect", &p.Dialect)
	r.dialect(t, p.Dialect)
	t.Optional().String("serial", &p.Serial)
	var text string
	if !t.String("address", &text) {
		return p
	}
	if text == "manual" {
		t.Fail("address", "a person reading or turning it is not supported yet by this version; give the address of an instrument: "+link.Accepted)
		return p
	}
	a, err := link.Parse(text)
	switch {
	case errors.Is(err, link.ErrUnsupported):
		scheme, _, _ := strings.Cut(text, ":")
		t.Fail("address", scheme+" is not supported yet by this version; use "+link.Accepted)
	case err != nil:
		t.Fail("address", err.Error())
	default:
		p.Address = a
		r.ports = append(r.ports, placedPort{t, a})
	}
	return p
}

// onePortEach refuses two instruments on one port, however the port is spelt.
func (r *reader) onePortEach() {
	for i, p := range r.ports {
		for _, q := range r.ports[:i] {
			if p.addr.Canonical() == q.addr.Canonical() {
				p.table.Fail("address", fmt.Sprintf("is the same port as %s.address (line %d); every instrument needs a port of its own",
					q.table.Path(), q.table.Line("address")))
				break
			}
		}
	}
}

// between reads the two nodes that an instrument is connected to.
func between(t *userfile.Table, v *instruments.Between) bool {
	var nodes []string
	if !t.Strings("between", &nodes) {
		return false
	}
	if len(nodes) != 2 {
		t.Fail("between", `give two nodes, like ["load_hi", "load_lo"]: the first less the second is what is measured`)
		return false
	}
	for i, n := range nodes {
		if !slices.Contains(instruments.Nodes, instruments.Node(n)) {
			unknownNode(t, n)
			return false
		}
		v[i] = instruments.Node(n)
	}
	if v[0] == v[1] {
		t.Fail("between", fmt.Sprintf("is %q twice; give two different nodes", v[0]))
		return false
	}
	return true
}

func unknownNode(t *userfile.Table, name string) {
	names := make([]string, len(instruments.Nodes))
	for i, n := range instruments.Nodes {
		names[i] = string(n)
	}
	t.Suggest("between", name, names, fmt.Sprintf("%q is no node; nodes are: %s", name, strings.Join(names, ", ")))
}

// number is a quantity that is read from text.
type number interface {
	encoding.TextUnmarshaler
	SI() float64
}

// above reads a quantity that has to be above zero and puts its SI value into v.
func above(t *userfile.Table, key string, q number, v *float64) bool {
	if !t.Text(key, q) {
		return false
	}
	if *v = q.SI(); *v <= 0 {
		t.Fail(key, "has to be above zero")
		return false
	}
	return true
}

// atLeastZero is above, zero allowed.
func atLeastZero(t *userfile.Table, key string, q number, v *float64) bool {
	if !t.Text(key, q) {
		return false
	}
	if *v = q.SI(); *v < 0 {
		t.Fail(key, "can't be below zero")
		return false
	}
	return true
}
