package practice

import (
	"fmt"
	"math"
	"time"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// bring brings a fault about and gives what undoes it. Faults of replies need
// nothing here: spoil looks them up.
func (b *Bench) bring(f Fault, i *Instrument) (lift func(), err error) {
	switch f.Kind {
	case Unplugged:
		return i.unplug()
	case QueueFull:
		i.inTurn(func() { overflow(i.device) })
	case PowerDip:
		return b.dip(i), nil
	case Drift:
		return b.drift(f), nil
	case Short:
		return b.short(f.Size)
	case RotorLocked:
		b.world.do(func(s *circuit.Sim) { s.SetLocked(true) })
		return func() { b.world.do(func(s *circuit.Sim) { s.SetLocked(false) }) }, nil
	case Open:
		return b.interrupt(f.On)
	default:
		if i != nil && i.own[f.Kind] != nil {
			return i.own[f.Kind](), nil
		}
	}
	return nil, nil
}

// overflow fills an error queue and one more, as an instrument in trouble does.
func overflow(d *scpi.Device) {
	for range 100 {
		d.Push(scpi.NewFault(-310, "practice"))
	}
}

func (b *Bench) short(ohms float64) (lift func(), err error) {
	b.world.do(func(s *circuit.Sim) { err = s.SetShort(ohms) })
	return func() { b.world.do(func(s *circuit.Sim) { err = s.SetShort(math.Inf(1)) }) }, err
}

// broken is the resistance of an interrupted part, Ω.
const broken = 1e6

// interrupt breaks a part of the board.
func (b *Bench) interrupt(part string) (lift func(), err error) {
	var before circuit.Board
	b.world.do(func(s *circuit.Sim) { before = s.Board() })
	switch part {
	case "flyback":
		if before.Flyback == nil {
			return nil, fmt.Errorf("this board has no flyback diode")
		}
		err = b.Alter(func(c *circuit.Board) { c.Flyback = nil })
		return func() { b.undo(func(c *circuit.Board) { c.Flyback = before.Flyback }) }, err
	default:
		err = b.Alter(func(c *circuit.Board) { c.Load.Resistance += broken })
		return func() { b.undo(func(c *circuit.Board) { c.Load.Resistance -= broken }) }, err
	}
}

// undo takes back what Alter took before; the board was sound then.
func (b *Bench) undo(f func(*circuit.Board)) {
	if err := b.Alter(f); err != nil {
		panic(err)
	}
}

// driftEvery is how often a drifting part is moved, bench time.
const driftEvery = 10 * time.Second

// drift moves a part's value by f.Size an hour until lifted. What has drifted stays so.
func (b *Bench) drift(f Fault) (lift func()) {
	place := map[string]func(*circuit.Board) *float64{
		"capacitor": func(c *circuit.Board) *float64 { return &c.Timing.Capacitance },
		"charge":    func(c *circuit.Board) *float64 { return &c.Timing.Common },
		"discharge": func(c *circuit.Board) *float64 { return &c.Timing.Down },
		"winding":   func(c *circuit.Board) *float64 { return &c.Load.Resistance },
		"threshold": func(c *circuit.Board) *float64 { return &c.Timer.Threshold },
	}[f.On]
	return b.world.every(driftEvery.Seconds(), func(s *circuit.Sim, span float64) {
		// A board that has wandered so far that it can't be simulated stays where it is.
		_ = s.Change(func(c *circuit.Board) { *place(c) *= math.Exp(f.Size * span / 3600) })
	})
}

// dip takes the mains away, from one instrument or from all, until lifted.
func (b *Bench) dip(one *Instrument) (lift func()) {
	hit := b.all
	if one != nil {
		hit = []*Instrument{one}
	}
	for _, i := range hit {
		i.dead.Store(true)
		if i.mains != nil {
			i.mains(false)
		}
	}
	return func() {
		for _, i := range hit {
			i.inTurn(i.restart)
			if i.mains != nil {
				i.mains(true)
			}
			i.dead.Store(false)
		}
	}
}

// restart is what coming back from a dip does to the message side: settings, queue and
// status as at power-on, whose bit says so.
func (i *Instrument) restart() {
	d := i.device
	d.Clear()
	d.Queue.Clear()
	d.Status.TakeEvents()
	if i.again != nil {
		i.again()
	}
	d.Status.Raise(scpi.EventPON)
}
