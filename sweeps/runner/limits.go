package runner

import (
	"fmt"
	"math"
	"sync"
	"time"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// limits knows since when each tripping quantity has been above its limit.
// Instants are bench time.
type limits struct {
	mu    sync.Mutex
	trips []sweeps.Trip
	above map[int]time.Duration // index of trip → since when
}

func newLimits(trips []sweeps.Trip) *limits {
	return &limits{trips: trips, above: map[int]time.Duration{}}
}

// has tells whether the plan trips on q.
func (l *limits) has(q sweeps.Quantity) bool {
	for _, t := range l.trips {
		if t.Quantity == q {
			return true
		}
	}
	return false
}

// observe takes one reading and returns the trip that it completes, if any. A
// reading that integrated over an aperture was above for as long when it ended.
func (l *limits) observe(q sweeps.Quantity, value float64, raw string, at, aperture time.Duration) *Trip {
	l.mu.Lock()
	defer l.mu.Unlock()
	for i, t := range l.trips {
		if t.Quantity != q {
			continue
		}
		if !(math.Abs(value) > t.Limit) {
			delete(l.above, i)
			continue
		}
		since, ok := l.above[i]
		if !ok {
			since = at - aperture
			l.above[i] = since
		}
		if at-since >= t.For {
			return &Trip{Raw: raw, Reason: fmt.Sprintf("%s %s is above its limit of %s for %s", q, si.Format(value, q.Unit()), si.Format(t.Limit, q.Unit()), t.For)}
		}
	}
	return nil
}

// pending is how long until a quantity now above its limit would trip; false when none is.
func (l *limits) pending(at time.Duration) (time.Duration, bool) {
	l.mu.Lock()
	defer l.mu.Unlock()
	wait, any := time.Duration(0), false
	for i, since := range l.above {
		if d := since + l.trips[i].For - at; !any || d < wait {
			wait, any = d, true
		}
	}
	return max(wait, 0), any
}
