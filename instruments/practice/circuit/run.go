package circuit

import (
	"fmt"
	"math"
)

// Watch lets an observer look at its window whoever advances the time. A
// window that begins in the past is refused: the past is not kept.
func (s *Sim) Watch(o Observer) error {
	from, to := o.Window()
	if !(from >= s.x.Time) || !(to >= from) || math.IsInf(to, 0) {
		return fmt.Errorf("circuit: can't look from %.9g s to %.9g s: the board is at %.9g s; watch before advancing", from, to, s.x.Time)
	}
	s.watchers = append(s.watchers, watcher{o, from, to})
	return nil
}

// Advance takes the board to a simulated time. Where nobody looks and the
// board repeats itself it leaps over whole periods. An earlier time than Now
// does nothing.
func (s *Sim) Advance(until float64) {
	for s.x.Time < until {
		s.drop()
		end, carried, watched := s.looking(until)
		s.smoothen(!watched && s.flywheel() && s.averaged(carried))
		if !watched && s.leap(end, carried) {
			continue
		}
		s.step(end)
	}
	s.drop()
}

// smoothen leaves cogging and commutation ripple out while nobody looks: they
// average out, and without them the board repeats itself.
func (s *Sim) smoothen(on bool) {
	if s.smooth != on {
		s.smooth, s.cycle.n = on, 0
	}
}

// averaged tells whether every carried observer looks for so many teeth of the rotor
// that what is left of cogging and ripple in its mean is below a thousandth of a
// ripple of a few percent.
func (s *Sim) averaged(all []carried) bool {
	teeth := s.x.Speed * math.Max(s.b.Load.CoggingPerTurn, s.b.Load.RipplePerTurn) / (2 * math.Pi)
	for _, o := range all {
		if o.span()*teeth < fewestTeeth {
			return false
		}
	}
	return true
}

const fewestTeeth = 8

// looking sorts the observers: the next instant at which one begins or, where it
// is carried over leaps, ends; those carried; and whether any other looks now.
func (s *Sim) looking(until float64) (end float64, all []carried, watched bool) {
	end = until
	for _, w := range s.watchers {
		o, ok := w.Observer.(carried)
		switch {
		case w.from > s.x.Time:
			end = math.Min(end, w.from)
		case ok:
			end = math.Min(end, w.to)
			all = append(all, o)
		default:
			watched = true
		}
	}
	return end, all, watched
}

// Run advances to a time with observers looking.
func (s *Sim) Run(until float64, observers ...Observer) error {
	for _, o := range observers {
		if err := s.Watch(o); err != nil {
			return err
		}
	}
	s.Advance(until)
	return nil
}

// drop lets go of observers whose window is over.
func (s *Sim) drop() {
	keep := s.watchers[:0]
	for _, w := range s.watchers {
		if w.to > s.x.Time {
			keep = append(keep, w)
		}
	}
	clear(s.watchers[len(keep):])
	s.watchers = keep
}
