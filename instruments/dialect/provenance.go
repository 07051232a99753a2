package dialect

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strings"
)

// Words that stand for a source.
const (
	Unchecked = "unchecked" // from memory
	Ours      = "ours"      // our own choice or addition
)

// Stated is one statement of a dialect with who says so.
type Stated struct{ Name, Source string }

// Statements is all that a dialect states with a source, in a steady order. A
// line counts twice where its query has a source of its own.
func (d *Dialect) Statements() (all []Stated) {
	add := func(name, source string) {
		if source != "" {
			all = append(all, Stated{name, source})
		}
	}
	line := func(name string, l Line) {
		add(name, l.Source)
		add(name+"?", l.AskSource)
	}
	for _, p := range d.Identities {
		add("identity", p.Source)
	}
	add("link", d.Link.Source)
	add("errors", d.Errors.Source)
	d.optional(add)
	if c := d.Channel; c != nil && c.Select != nil {
		line("channel.select", *c.Select)
	}
	for _, of := range []map[string]Line{d.Scaling, d.Commands} {
		for _, name := range slices.Sorted(maps.Keys(of)) {
			line(name, of[name])
		}
	}
	for _, lines := range [][]Line{d.Open, d.Setup, d.Close} {
		for _, l := range lines {
			line(l.Name, l)
		}
	}
	for _, s := range d.Speeds {
		add("speed", s.Source)
	}
	for _, key := range d.Memory {
		add(key, Unchecked)
	}
	for _, f := range d.Figures {
		add(strings.TrimSpace("accuracy of "+f.Of), f.Source)
	}
	return all
}

// optional adds the sections that need not be there.
func (d *Dialect) optional(add func(name, source string)) {
	if c := d.Completion; c != nil {
		add("completion", c.Source)
	}
	if c := d.Channel; c != nil {
		add("channel", c.Source)
	}
	if p := d.Protection; p != nil {
		add("protection", p.Source)
	}
	if m := d.Meter; m != nil {
		add("meter", m.Source)
	}
	if s := d.Screen; s != nil {
		add("screen", s.Source)
	}
	if w := d.Waveform; w != nil {
		add("waveform", w.Source)
	}
	if c := d.Conditions; c != nil {
		add("conditions", c.Source)
	}
}

// Count is how many statements are from a document, our own, and from memory.
func (d *Dialect) Count() (checked, ours, unchecked int) {
	for _, s := range d.Statements() {
		switch s.Source {
		case Ours:
			ours++
		case Unchecked:
			unchecked++
		default:
			checked++
		}
	}
	return checked, ours, unchecked
}

// Unchecked names the lines of which a half is written from memory, sorted.
func (d *Dialect) Unchecked() (names []string) {
	for name, l := range d.Commands {
		if !l.Checked() {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	return names
}

// guards are the lines of a supply that a night relies on: to switch off, to
// see that it is off, to limit, and to see that a limit acted.
var guards = []string{
	"off", "output", "measure_voltage", "voltage", "current_limit",
	"over_voltage", "over_voltage_arm", "over_voltage_tripped", "over_current_tripped",
}

// Unproven names the guards of a supply that are written from memory: nobody
// may leave the bench alone with them before they were seen to work.
func (d *Dialect) Unproven() (names []string) {
	if d.Head.Role != RoleSupply {
		return nil
	}
	if c := d.Channel; c != nil && c.Select != nil && !c.Select.Checked() {
		names = append(names, "channel.select")
	}
	for _, name := range guards {
		if l, ok := d.Commands[name]; ok && !l.Checked() {
			names = append(names, name)
		}
	}
	return names
}

// Cannot lists in words what the role may do and this dialect has no line for.
func (d *Dialect) Cannot() (words []string) {
	for name, s := range lines[d.Head.Role] {
		if _, ok := d.Commands[name]; !ok && s.alternative == "" {
			words = append(words, s.does)
		}
	}
	slices.Sort(words)
	return words
}

// Manuals are the documents that the dialect cites, as "tag document", sorted by tag.
func (d *Dialect) Manuals() (documents []string) {
	cited := map[string]bool{}
	for _, s := range d.Statements() {
		cited[s.Source] = true
	}
	tags := slices.SortedFunc(maps.Keys(d.Sources), func(a, b string) int {
		return cmp.Or(cmp.Compare(len(a), len(b)), cmp.Compare(a, b))
	})
	for _, tag := range tags {
		if cited[tag] {
			documents = append(documents, fmt.Sprintf("%s %s", tag, d.Sources[tag]))
		}
	}
	return documents
}
