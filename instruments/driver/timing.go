package driver

import "time"

// readingTime is allowed for one reading on top of a plain reply: the
// apertures, the ranging, and a tenth for the instrument's own business.
func (m *Meter) readingTime() time.Duration {
	apertures := 1.0
	if m.d.Meter.AutoZero {
		apertures = 2
	}
	return m.bench(1.1*apertures*m.set.Aperture + m.d.Meter.RangeTime.Seconds())
}

// recordTime is the wall time that a record itself takes.
func (s *Scope) recordTime() time.Duration { return s.bench(s.set.Duration) }

// A trigger may come up to triggerWait (bench time) after a record began to
// wait for it: a driver board at work has several a second. The record with
// its part before the trigger may take some of its length more. The allowance
// is never below triggerFloor (wall), which a simulation on a busy computer
// needs however fast the bench's clock runs.
const (
	triggerWait  = 1.0 // s
	triggerFloor = 3 * time.Second
)

// triggerTime is allowed for a triggered record to be complete.
func (s *Scope) triggerTime() time.Duration {
	return max(s.bench(triggerWait+4*s.set.Duration), triggerFloor+s.recordTime())
}
