package practice

import (
	"fmt"
	"slices"
	"strings"
	"time"
)

// Kind names a fault.
type Kind string

// The faults on the wire, those of an instrument, and those of the board.
const (
	Silence    Kind = "silence"     // no reply
	Late       Kind = "late"        // the reply comes Size s (wall) later
	Twice      Kind = "twice"       // the reply comes twice
	Truncated  Kind = "truncated"   // half the reply, and no end
	WrongCount Kind = "wrong-count" // a block announces Size bytes more than it has
	Garbage    Kind = "garbage"     // Size bytes of line noise inside the reply
	StrayCR    Kind = "stray-cr"    // CR before and behind the reply
	StrayLF    Kind = "stray-lf"    // an empty line behind the reply
	Echo       Kind = "echo"        // every message comes back before its reply
	Unplugged  Kind = "unplugged"   // the port is gone; lifted, it is back under another name
	Intruder   Kind = "intruder"    // another client's question is answered to us first

	QueueFull  Kind = "queue-full"  // the error queue overflows
	Tripped    Kind = "tripped"     // the supply's over-voltage latch trips
	StuckWiper Kind = "stuck-wiper" // the wiper stays, whatever the code read back says
	LeadOff    Kind = "lead-off"    // a meter's or scope's lead has come off
	ProbeTen   Kind = "probe-x10"   // the probe's slide is moved: ×10 becomes ×1, ×1 becomes ×10
	PowerDip   Kind = "power-dip"   // the mains fails until lifted

	Drift       Kind = "drift"        // a part wanders by Size (share) an hour
	Short       Kind = "short"        // Size Ω across the board's supply
	Open        Kind = "open"         // a part is interrupted
	RotorLocked Kind = "rotor-locked" // the motor can't turn
)

// Fault is one thing wrong with the bench.
type Fault struct {
	Kind  Kind    `json:"kind"`
	On    string  `json:"on,omitempty"`    // an instrument's name, or a part of the board; empty: what Trait says
	Size  float64 `json:"size,omitempty"`  // in the unit that Trait says; 0: its default
	Times int     `json:"times,omitempty"` // replies that it spoils, then it is over; 0: until lifted
	For   float64 `json:"for,omitempty"`   // s of bench time until it lifts itself; 0: until lifted
	Says  string  `json:"says,omitempty"`  // the message of an intruder; empty: *IDN?
}

// Trait says what a kind of fault needs.
type Trait struct {
	Kind    Kind
	Words   string
	On      string   // "instrument": On has to name one; "part": On may name one of Parts; else nothing
	Roles   []string // of the instruments that can have it; nil: all
	Parts   []string // the first is meant when On is empty
	Unit    string   // of Size; empty: it has none
	Default float64  // of Size
	Replies bool     // Times counts replies
	Lasting bool     // it can be lifted
}

var traits = []Trait{
	{Kind: Silence, Words: "gives no reply", On: "instrument", Replies: true, Lasting: true},
	{Kind: Late, Words: "replies late", On: "instrument", Unit: "s", Default: 4, Replies: true, Lasting: true},
	{Kind: Twice, Words: "gives each reply twice", On: "instrument", Replies: true, Lasting: true},
	{Kind: Truncated, Words: "gives half a reply", On: "instrument", Replies: true, Lasting: true},
	{Kind: WrongCount, Words: "announces more bytes than it sends", On: "instrument", Unit: "bytes", Default: 100, Replies: true, Lasting: true},
	{Kind: Garbage, Words: "has noise on its line", On: "instrument", Unit: "bytes", Default: 8, Replies: true, Lasting: true},
	{Kind: StrayCR, Words: "puts CR round its replies", On: "instrument", Replies: true, Lasting: true},
	{Kind: StrayLF, Words: "sends an empty line behind its replies", On: "instrument", Replies: true, Lasting: true},
	{Kind: Echo, Words: "echoes what it hears", On: "instrument", Replies: true, Lasting: true},
	{Kind: Unplugged, Words: "is unplugged; plugged in again it has another name", On: "instrument", Lasting: true},
	{Kind: Intruder, Words: "answers another client's question as well", On: "instrument", Replies: true, Lasting: true},
	{Kind: QueueFull, Words: "has an error queue that overflows", On: "instrument"},
	{Kind: Tripped, Words: "has tripped its over-voltage latch", On: "instrument", Roles: []string{"supply"}},
	{Kind: StuckWiper, Words: "has a wiper that stays where it is", On: "instrument", Roles: []string{"pot"}, Lasting: true},
	{Kind: LeadOff, Words: "has lost a lead", On: "instrument", Roles: []string{"meter", "scope"}, Lasting: true},
	{Kind: ProbeTen, Words: "has the slide of its probes moved", On: "instrument", Roles: []string{"scope"}, Lasting: true},
	{Kind: PowerDip, Words: "mains failure of the bench, or of one instrument", On: "any", Lasting: true},
	{Kind: Drift, Words: "a part wanders", On: "part", Parts: []string{"capacitor", "charge", "discharge", "winding", "threshold"}, Unit: "an hour", Default: 0.02, Lasting: true},
	{Kind: Short, Words: "the board's supply is shorted", Unit: "Ω", Default: 0.5, Lasting: true},
	{Kind: Open, Words: "a part is interrupted", On: "part", Parts: []string{"load", "flyback"}, Lasting: true},
	{Kind: RotorLocked, Words: "the motor can't turn", Lasting: true},
}

// Traits lists every kind of fault.
func Traits() []Trait { return slices.Clone(traits) }

// TraitOf finds what a kind needs, or says which kinds there are.
func TraitOf(k Kind) (Trait, error) {
	i := slices.IndexFunc(traits, func(t Trait) bool { return t.Kind == k })
	if i < 0 {
		names := make([]string, len(traits))
		for n, t := range traits {
			names[n] = string(t.Kind)
		}
		return Trait{}, fmt.Errorf("no fault %q; there are %s", k, strings.Join(names, ", "))
	}
	return traits[i], nil
}

// inForce is a fault that has been injected and not lifted.
type inForce struct {
	Fault
	used int    // replies spoilt
	lift func() // nil: nothing to undo
}

// Inject brings a fault about, now. A fault with For lifts itself.
func (b *Bench) Inject(f Fault) error {
	t, err := TraitOf(f.Kind)
	if err != nil {
		return err
	}
	i, err := b.target(&f, t)
	if err != nil {
		return err
	}
	if err := b.check(&f, t); err != nil {
		return err
	}
	lift, err := b.bring(f, i)
	if err != nil {
		return fmt.Errorf("fault %s: %w", f.Kind, err)
	}
	if !t.Lasting {
		return nil
	}
	b.faults.mu.Lock()
	b.faults.all = append(b.faults.all, &inForce{Fault: f, lift: lift})
	b.faults.mu.Unlock()
	if f.For > 0 {
		b.spawn(func() {
			if b.world.clock.Sleep(b.ctx, seconds(f.For)) == nil {
				b.Lift(f.Kind, f.On)
			}
		})
	}
	return nil
}

// check refuses what the kind can't have, and fills in its defaults.
func (b *Bench) check(f *Fault, t Trait) error {
	switch {
	case b.ctx.Err() != nil:
		return fmt.Errorf("fault %s: the practice bench is closed", f.Kind)
	case f.Size != 0 && t.Unit == "":
		return fmt.Errorf("fault %s has no size", f.Kind)
	case f.Size < 0 && f.Kind != Drift:
		return fmt.Errorf("fault %s: size %g is below 0", f.Kind, f.Size)
	case f.Times < 0 || f.Times > 0 && !t.Replies:
		return fmt.Errorf("fault %s: times = %d; only faults of replies are counted, from 1 up", f.Kind, f.Times)
	case f.For < 0 || f.For > 0 && !t.Lasting:
		return fmt.Errorf("fault %s: for = %g s; it happens at one instant, and is not lifted", f.Kind, f.For)
	case f.Says != "" && f.Kind != Intruder:
		return fmt.Errorf("fault %s says nothing; only an intruder does", f.Kind)
	}
	if f.Size == 0 {
		f.Size = t.Default
	}
	if f.Kind == Intruder && f.Says == "" {
		f.Says = "*IDN?"
	}
	for _, old := range b.Faults() {
		if old.Kind == f.Kind && old.On == f.On && t.Lasting {
			return fmt.Errorf("fault %s on %q is there already; lift it first", f.Kind, f.On)
		}
	}
	return nil
}

// target finds the instrument a fault is on; nil for the board and the whole bench.
func (b *Bench) target(f *Fault, t Trait) (*Instrument, error) {
	switch {
	case t.On == "part" && f.On == "":
		f.On = t.Parts[0]
	case t.On == "part" && !slices.Contains(t.Parts, f.On):
		return nil, fmt.Errorf("fault %s: no part %q; there are %s", f.Kind, f.On, strings.Join(t.Parts, ", "))
	case t.On == "" && f.On != "":
		return nil, fmt.Errorf("fault %s is on no instrument; leave out %q", f.Kind, f.On)
	case t.On == "any" && f.On == "":
	case t.On == "instrument" || t.On == "any":
		return b.fitting(f, t)
	}
	return nil, nil
}

// fitting finds the instrument named, or the only one that can have the fault.
func (b *Bench) fitting(f *Fault, t Trait) (*Instrument, error) {
	var fit []*Instrument
	var names []string
	for _, i := range b.all {
		if t.Roles == nil || slices.Contains(t.Roles, i.Role) {
			fit, names = append(fit, i), append(names, i.Name)
		}
	}
	if f.On == "" && len(fit) == 1 {
		f.On = fit[0].Name
	}
	if n := slices.Index(names, f.On); n >= 0 {
		return fit[n], nil
	}
	return nil, fmt.Errorf("fault %s: say on which instrument: one of %s", f.Kind, strings.Join(names, ", "))
}

// Lift ends a fault. An empty on lifts it wherever it is. It tells whether there was one.
func (b *Bench) Lift(k Kind, on string) bool {
	var gone []*inForce
	b.faults.mu.Lock()
	b.faults.all = slices.DeleteFunc(b.faults.all, func(f *inForce) bool {
		match := f.Kind == k && (on == "" || f.On == on)
		if match {
			gone = append(gone, f)
		}
		return match
	})
	b.faults.mu.Unlock()
	for _, f := range gone {
		if f.lift != nil {
			f.lift()
		}
	}
	return len(gone) > 0
}

// Faults are the faults in force, in the order they came.
func (b *Bench) Faults() []Fault {
	b.faults.mu.Lock()
	defer b.faults.mu.Unlock()
	out := make([]Fault, len(b.faults.all))
	for i, f := range b.faults.all {
		out[i] = f.Fault
		if f.Times > 0 {
			out[i].Times -= f.used
		}
	}
	return out
}

// Schedule brings a fault about at an instant of bench time. What is wrong with the
// fault is said now; what goes wrong then, to failed, which may be nil.
func (b *Bench) Schedule(at time.Duration, f Fault, failed func(error)) error {
	t, err := TraitOf(f.Kind)
	if err != nil {
		return err
	}
	probe := f
	if _, err := b.target(&probe, t); err != nil {
		return err
	}
	b.spawn(func() {
		if b.world.clock.Sleep(b.ctx, at-b.world.clock.Elapsed()) != nil {
			return
		}
		if err := b.Inject(f); err != nil && failed != nil {
			failed(err)
		}
	})
	return nil
}

// spawn runs f in a goroutine that Close waits for; not on a closed bench.
func (b *Bench) spawn(f func()) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.ctx.Err() == nil {
		b.wg.Go(f)
	}
}
