// Package dialect says how an instrument family spells a command and answers a
// query. A dialect is a data file (TOML); adding an instrument needs no Go.
//
// A file has these sections:
//
//	[dialect]     name, role (supply, meter, scope, pot), about; accepts_any where an unknown identity will do
//	[sources]     tag = document; every line carries source = a tag, "ours" (our own choice) or "unchecked" (from memory)
//	[[identity]]  maker and model as patterns ("*" stands for anything, case does not matter), or text for replies with fewer than 4 fields
//	[link]        terminator (nl, cr, crnl), timeout of one reply, gap between exchanges, echo,
//	              line (serial settings where the address gives none), clear_bytes (a device clear)
//	[errors]      form ("queue" or "none"), ask, depth
//	[completion]  style "held" (the reply is held back until done) or "polled" (asked until the reply is the word in until)
//	[channel]     select: a line sent before anything else on an instrument of several channels
//	[protection]  clear_energises: whether clearing a latch switches the output on again
//	[meter]       auto_zero, range_time, speed_from ("nplc" or "aperture");  [[speed]] the speeds it has
//	[waveform]    family, samples, byte_order, clip_low, clip_high, most_points, time_base
//	[command]     the lines, by the names of this role (lines.go lists them)
//	[[open]], [[close]]  lines sent when the instrument is opened and closed
//	[[accuracy]]  limits of error, one a quantity and range
//
// A line has send (a message without reply), ask (a query), or both: a setting
// and how it is read back. {value} and {channel} stand for what is put in.
// reply says what the answer is: number (the default), bool (yes, no: the
// words for it), bit (of the number: which in bit, base decimal or hex), text
// (want: the answers that will do), numbers (fields: their names in order) or
// block. A number may have unit (a suffix behind it), scale (to SI), overload and
// no_value (whole replies), infinity (what 9.9E37 means). step and within say by how much a setting read back may differ.
package dialect

import (
	"errors"
	"fmt"
	"slices"
	"strings"
	"time"

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
	Waveform   *Waveform
	Commands   map[string]Line
	Open       []Line
	Close      []Line
	Figures    []Figure

	Text string // the file as read
	Hash string // SHA-256 of Text, hexadecimal
}

// Head names the dialect. AcceptsAny lets a bench file use the dialect for an
// instrument that no dialect knows.
type Head struct {
	Name       string
	Role       Role
	About      string
	AcceptsAny bool
}

// Link is how the family talks; zero fields mean the link's own defaults.
type Link struct {
	Terminator string        // what ends a message sent
	Timeout    time.Duration // of one reply; settling and aperture come on top
	Line       string        // serial settings as an address gives them, "baud=115200&stop=2"; the address wins
	ClearBytes []byte        // the family's device clear on a stream, if it has one
	Gap        time.Duration // least time between two exchanges
	Echo       bool          // each line sent comes back before its reply
}

// ErrorQueue is how errors are asked for.
type ErrorQueue struct {
	Form   string // queue: code, text; none: it has none
	Ask    string
	Depth  int
	Source string
}

// Completion is how the end of an operation is seen.
type Completion struct {
	Style  string // held or polled
	Ask    string
	Until  string // polled: the reply that means done
	Source string
}

// Channel says how a channel is selected where the lines do not name it.
type Channel struct {
	Select Line
}

// Protection says what clearing a protection latch does.
type Protection struct {
	ClearEnergises bool
	Source         string
}

// Meter is what a meter's readings take.
type Meter struct {
	AutoZero  bool          // each reading takes two apertures
	RangeTime time.Duration // allowed for a change of range or function
	SpeedFrom string        // nplc or aperture
	Source    string
}

// Speed is one of a meter's speeds. Setting is what the instrument is told:
// periods of the power line, or seconds with SpeedFrom "aperture". Resolution
// and Adds (what haste adds to the limit of error) are shares of the range.
type Speed struct {
	Setting    float64
	Resolution float64
	Adds       float64
	Source     string
}

// Waveform is the shape of a record. The one scaling family known so far is
// code-linear: volts = code × yincrement + yorigin, instant = xorigin + i × xincrement.
type Waveform struct {
	Family     string
	Samples    string // int16 or int8
	ByteOrder  string // big or little
	ClipLow    int16
	ClipHigh   int16
	MostPoints int
	TimeBase   float64 // relative limit of error of the sample interval
	Source     string
}

// Figure is a maker's limit of error for one quantity and range, in the unit
// of the quantity. Range is 0 where the instrument has a single one; Highest is
// the reading above which it says overload, 0 where that is not known.
type Figure struct {
	Of       string
	Range    float64
	Highest  float64
	Accuracy instruments.Accuracy
	Source   string
	Note     string
}

// Figure finds the figure of a quantity for a range: the one whose range is
// nearest at or above full, or the only one.
func (d *Dialect) Figure(of string, full float64) (Figure, bool) {
	var best Figure
	found := false
	for _, f := range d.Figures {
		if f.Of != of || f.Range > 0 && f.Range < full*(1-1e-6) {
			continue
		}
		if !found || f.Range < best.Range {
			best, found = f, true
		}
	}
	return best, found
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

// Unchecked names the lines that are written from memory, sorted.
func (d *Dialect) Unchecked() (names []string) {
	for name, l := range d.Commands {
		if !l.Checked() {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	return names
}

// The kinds of fault. Test for them with errors.Is.
var (
	ErrCannot  = errors.New("not in this dialect")
	ErrUnknown = errors.New("unknown dialect")
)
