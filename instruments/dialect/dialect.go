// Package dialect says how an instrument family spells a command and answers a
// query. A dialect is a data file (TOML); adding an instrument needs no Go.
//
// A file has these sections; what stands in them is told where their Go types are.
//
//	[dialect]     name, role (supply, meter, scope, pot, cutoff, thermometer), about; accepts_any where an unknown identity will do;
//	              tried: on which device, by whom and when; left out: never
//	[sources]     tag = document; every line carries source = a tag, "ours" (our own choice) or "unchecked" (from memory)
//	[[identity]]  maker and model as patterns ("*" stands for anything, case does not matter), or text for replies with fewer than 4 fields
//	[link]        kinds, port, line, terminator, reply_end, echo, timeout, gap, longest, clear (Link)
//	[errors]      form ("queue", "events", "text" or "none"), ask, depth, none, sign (ErrorQueue)
//	[completion]  style ("held", "polled" or "dwell"), ask, until, dwell (Completion)
//	[channel]     select, count, names (Channel)
//	[protection]  clear_energises: whether clearing a latch switches the output on again
//	[meter]       auto_zero, range_time, speed_from ("nplc" or "aperture");  [[speed]] the speeds it has
//	[screen]      of a scope: divisions, time_divisions, offset (Screen)
//	[waveform]    family, samples, byte_order, clip_low, clip_high, most_points … (Waveform)
//	[scaling]     of a scope: lines whose replies are fields of the scaling, where one query does not give them all
//	[command]     the lines, by the names of this role (lines.go lists them)
//	[[open]], [[setup]], [[close]]  lines sent at opening, after a reset, and at closing
//	[conditions]  interval, temperature, warm_up, speed, auto_zero: what the limits of error hold for
//	[[accuracy]]  limits of error, one a quantity and range (Figure)
//
// In a section of which some keys are from memory, unchecked = ["key"] names
// them beside the source of the rest.
//
// A line has send (a message without reply), ask (a query), or both: a setting
// and how it is read back. {value} and {channel} stand for what is put in.
// reply says what the answer is (Line).
package dialect

import (
	"errors"
	"fmt"
	"strings"

	"nightbench/instruments"
)

// Role is what an instrument is on a bench.
type Role string

// The roles a dialect may be written for.
const (
	RoleSupply Role = "supply"
	RoleMeter  Role = "meter"
	RoleScope  Role = "scope"
	RolePot    Role = "pot"
	RoleCutoff Role = "cutoff"
	RoleProbe  Role = "thermometer"
)

// Dialect is one dialect file, read and checked.
type Dialect struct {
	Head       Head
	Sources    map[string]string
	Identities []Pattern
	Link       Link
	Errors     ErrorQueue
	Completion *Completion
	Channel    *Channel
	Protection *Protection
	Meter      *Meter
	Speeds     []Speed
	Screen     *Screen
	Waveform   *Waveform
	Scaling    map[string]Line
	Commands   map[string]Line
	Open       []Line
	Setup      []Line
	Close      []Line
	Conditions *Conditions
	Figures    []Figure
	Memory     []string // keys of sections that are from memory, while the rest is from their source

	Path string // of the user's own file; empty for one that comes with the program
	Text string // the file as read
	Hash string // SHA-256 of Text, hexadecimal
}

// Head names the dialect. AcceptsAny lets a bench file use the dialect for an
// instrument that no dialect knows. Tried is empty until somebody tried it.
type Head struct {
	Name       string
	Role       Role
	About      string
	AcceptsAny bool
	Tried      string
}

// Line finds a line by its name, or says in words what this dialect can't do.
func (d *Dialect) Line(name string) (Line, error) {
	if l, ok := d.Commands[name]; ok {
		return l, nil
	}
	does := name
	if s, ok := specOf(d.Head.Role, name); ok {
		does = s.does
	}
	return Line{}, fmt.Errorf("%w: dialect %s can't %s (it has no line %q); use another dialect, or add the line to a file of your own",
		ErrCannot, d.Head.Name, does, name)
}

// Put is a value on a channel, which lines name in the family's way.
func (d *Dialect) Put(value float64, channel int) Put {
	p := Put{Value: value, Channel: channel}
	if c := d.Channel; c != nil && channel >= 1 && channel <= len(c.Names) {
		p.Name = c.Names[channel-1]
	}
	return p
}

// HasChannels tells whether the dialect can say which channel is meant.
func (d *Dialect) HasChannels() bool {
	if d.Channel != nil {
		return true
	}
	for _, l := range d.Commands {
		if strings.Contains(l.Send+l.Ask, "{channel}") {
			return true
		}
	}
	return false
}

// The kinds of fault. Test for them with errors.Is.
var (
	ErrCannot  = instruments.ErrCannot
	ErrUnknown = errors.New("unknown dialect")
)
