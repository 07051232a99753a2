package bench

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"sync"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

// Options say how a bench is opened.
type Options struct {
	Clock    instruments.Clock
	Dial     link.Dial                                // replaces the real serial or TCP opening, for tests; nil: the real one
	Log      func(words string)                       // hears what was noticed at opening; may be nil
	Trace    func(e link.Event)                       // sees every byte that passes; as link.Options.Trace; may be nil
	Exchange func(instrument string, e scpi.Exchange) // hears every exchange; quick, may be called from several goroutines; may be nil
}

// Info is what is known of one instrument once it is open.
type Info struct {
	Name     string               `json:"name"` // "supply", "meter average"
	Role     string               `json:"role"`
	Address  string               `json:"address"`
	Identity instruments.Identity `json:"identity"`
	Dialect  string               `json:"dialect"`
	Hash     string               `json:"dialect_hash"`          // SHA-256 of the dialect file
	From     string               `json:"dialect_from"`          // what finds the dialect again: its name, or the path of the user's own file
	Notes    []string             `json:"notes,omitempty"`       // noticed at opening: "its output was on already"
	Memory   []string             `json:"from_memory,omitempty"` // lines of the dialect that nobody checked against a manual
}

// Opened is a bench whose instruments answer. Close it when done.
type Opened struct {
	instruments.Bench
	Info    []Info // in the order supply, meters, scope, pot, cutoff
	FoundOn bool   // the supply's output was on already when it was opened

	open []*instrument // in the order of Info
}

// slot is one instrument to be opened.
type slot struct {
	name string
	role dialect.Role
	port Port
	d    *dialect.Dialect // nil: to be found by identity
	from string
	make func(ctx context.Context, i *instrument) (notes []string, err error)
}

// instrument is a slot once its link is open.
type instrument struct {
	slot
	info Info
	link *link.Link
	conn *scpi.Conn
	stop func(ctx context.Context) error // the driver's closing lines; nil before it was made
}

// Open opens all instruments of a bench, side by side: link, identity,
// dialect, driver. When any fails the others are closed again and every
// failure is told. An instrument that is already feeding the board is said to
// be so and left as it is.
func Open(ctx context.Context, f *File, o Options) (*Opened, error) {
	b := &Opened{Bench: instruments.Bench{
		Wiring: f.Wiring, Supply: instruments.NoSupply, Scope: instruments.NoScope, Pot: instruments.NoPot, Cutoff: instruments.NoCutoff,
		Meters: make([]instruments.Meter, len(f.Meters)),
	}}
	slots := b.slots(f, o)
	if err := resolve(slots, f.Path); err != nil {
		return nil, err // before any port is opened
	}
	if err := b.openAll(ctx, slots, o); err != nil {
		return nil, err
	}
	if err := b.honest(f, o); err != nil {
		return nil, errors.Join(err, b.Close(context.WithoutCancel(ctx)))
	}
	return b, nil
}

// slots lists the instruments of a file with what makes each its driver.
func (b *Opened) slots(f *File, o Options) []slot {
	w := f.Wiring
	slots := []slot{b.supplySlot(f.Supply, w.Supply, o)}
	for n, p := range f.Meters {
		slots = append(slots, b.meterSlot(n, p, w.Meters[n], f.Line, o))
	}
	if f.Scope != nil {
		slots = append(slots, slot{name: "scope", role: dialect.RoleScope, port: *f.Scope,
			make: func(ctx context.Context, i *instrument) ([]string, error) {
				s, notes, err := driver.OpenScope(ctx, i.conn, i.d, i.options(o))
				if err == nil {
					b.Scope, i.stop = s, s.Close
				}
				return notes, err
			}})
	}
	if f.Pot != nil {
		slots = append(slots, slot{name: "pot", role: dialect.RolePot, port: *f.Pot,
			make: func(ctx context.Context, i *instrument) ([]string, error) {
				p, notes, err := driver.OpenPot(ctx, i.conn, i.d, driver.PotOptions{Options: i.options(o), Codes: w.Pot.Codes})
				if err == nil {
					b.Pot, i.stop = p, p.Close
				}
				return notes, err
			}})
	}
	if f.Cutoff != nil {
		slots = append(slots, b.cutoffSlot(*f.Cutoff, o))
	}
	return slots
}

func (b *Opened) supplySlot(p Port, w instruments.SupplyWiring, o Options) slot {
	return slot{name: "supply", role: dialect.RoleSupply, port: p,
		make: func(ctx context.Context, i *instrument) ([]string, error) {
			s, notes, err := driver.OpenSupply(ctx, i.conn, i.d, i.supplyOptions(w, o))
			if err == nil {
				b.Supply, b.FoundOn, i.stop = s, s.FoundOn(), s.Close
			}
			return notes, err
		}}
}

func (b *Opened) meterSlot(n int, p Port, w instruments.MeterWiring, line float64, o Options) slot {
	return slot{name: "meter " + w.Name, role: dialect.RoleMeter, port: p,
		make: func(ctx context.Context, i *instrument) ([]string, error) {
			m, notes, err := driver.OpenMeter(ctx, i.conn, i.d, driver.MeterOptions{Options: i.options(o), Accuracy: w.Accuracy, LineFrequency: line})
			if err == nil {
				b.Meters[n], i.stop = m, m.Close
			}
			return notes, err
		}}
}

// openAll opens the slots side by side and waits for all of them.
func (b *Opened) openAll(ctx context.Context, slots []slot, o Options) error {
	opened, errs := make([]*instrument, len(slots)), make([]error, len(slots))
	var all sync.WaitGroup
	for n := range slots {
		all.Go(func() { opened[n], errs[n] = openOne(ctx, slots[n], o) })
	}
	all.Wait()
	for n, i := range opened {
		if errs[n] != nil {
			continue
		}
		b.open, b.Info = append(b.open, i), append(b.Info, i.info)
		for _, note := range i.info.Notes {
			if o.Log != nil {
				o.Log(i.name + ": " + note)
			}
		}
	}
	if err := errors.Join(errs...); err != nil {
		return errors.Join(err, b.Close(context.WithoutCancel(ctx)))
	}
	return nil
}

// honest holds what the file says of the bench against who answers: time is
// never sped up in front of real instruments, and what is simulated is called so.
func (b *Opened) honest(f *File, o Options) error {
	who := b.Info[0].Identity
	practice := isPractice(who)
	switch pace := o.Clock.Pace(); {
	case pace != 1 && !practice:
		return fmt.Errorf("%w: pace %g, but the supply is a real one (%s); only a practice bench can be sped up", ErrPace, pace, who)
	case f.Wiring.Practice && !practice:
		return fmt.Errorf("%w: the bench file says practice = true, but the supply is a real one (%s); remove that line", ErrPace, who)
	case practice && !b.Practice:
		b.Practice = true
		b.Info[0].Notes = append(b.Info[0].Notes, "a practice instrument: everything recorded is marked as practice")
		if o.Log != nil {
			o.Log("supply: a practice instrument: everything recorded is marked as practice")
		}
	}
	return nil
}

// ErrPace means that a bench claims to be a practice bench and is none.
var ErrPace = errors.New("not a practice bench")

// isPractice tells the program's own simulated instruments.
func isPractice(id instruments.Identity) bool {
	return strings.EqualFold(id.Maker, "Nightbench") && strings.HasPrefix(strings.ToLower(id.Model), "practice")
}

// Close sends the closing lines and closes the links, last opened first. It
// switches nothing off: that is MakeSafe's affair, before. Every failure is told.
func (b *Opened) Close(ctx context.Context) error {
	var errs []error
	for _, i := range slices.Backward(b.open) {
		errs = append(errs, i.close(ctx))
	}
	b.open = nil
	return errors.Join(errs...)
}

func (i *instrument) close(ctx context.Context) error {
	var errs []error
	if i.stop != nil {
		errs = append(errs, i.stop(ctx))
	}
	errs = append(errs, i.link.Close())
	if err := errors.Join(errs...); err != nil {
		return fmt.Errorf("close %s: %w", i.name, err)
	}
	return nil
}

func (i *instrument) options(o Options) driver.Options {
	return driver.Options{Name: i.name, Channel: i.port.Channel, Clock: o.Clock}
}

func (i *instrument) supplyOptions(w instruments.SupplyWiring, o Options) driver.SupplyOptions {
	return driver.SupplyOptions{Options: i.options(o), MaxVoltage: si.Volts(w.MaxVoltage), MaxCurrent: si.Amperes(w.MaxCurrent)}
}
