package runner

import (
	"time"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Vitals is the latest of what changes all the time; a copy.
func (r *Runner) Vitals() sweeps.Vitals {
	r.mu.Lock()
	defer r.mu.Unlock()
	v := r.vitals
	v.At = r.o.Clock.Now()
	return v
}

func (r *Runner) changed() {
	if r.o.Changed != nil {
		r.o.Changed()
	}
}

// tell changes the vitals under the lock.
func (r *Runner) tell(f func(*sweeps.Vitals)) {
	r.mu.Lock()
	f(&r.vitals)
	r.mu.Unlock()
}

// doing sets the headline and the sentence under it.
func (r *Runner) doing(headline, detail string) {
	r.tell(func(v *sweeps.Vitals) { v.Doing, v.Detail = headline, detail })
	r.changed()
}

// sawSupply keeps the newest supply state.
func (r *Runner) sawSupply(s instruments.SupplyState) {
	now := r.o.Clock.Now()
	r.tell(func(v *sweeps.Vitals) {
		v.ReadAt = &now
		v.Voltage, v.VoltageU = SampleValue(s.Voltage)
		v.Current, v.CurrentU = SampleValue(s.Current)
	})
}

// SampleValue is a sample's value with the standard uncertainty of its accuracy figure (rectangular: a/√3, GUM 4.3.7).
func SampleValue(s instruments.Sample) (value, u *float64) {
	if s.Outcome != instruments.Measured {
		return nil, nil
	}
	x := s.Value
	half := s.Accuracy.Limit(x, s.Range) + s.Accuracy.Resolution/2
	su := half / sqrt3
	return &x, &su
}

const sqrt3 = 1.7320508075688772

func (r *Runner) energised() sweeps.Energised {
	r.mu.Lock()
	defer r.mu.Unlock()
	return r.vitals.Energised
}

// setEnergised says what is known of the output, and since when.
func (r *Runner) setEnergised(e sweeps.Energised, by []string) {
	now := r.o.Clock.Now()
	r.tell(func(v *sweeps.Vitals) {
		v.Energised, v.Since, v.ConfirmedBy = e, &now, by
		if e == sweeps.EnergisedYes {
			v.ReadAt = &now // blind time counts from here
		}
	})
	r.changed()
}

// supplyAge is how old the newest good supply state is, wall time.
func (r *Runner) supplyAge() time.Duration {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.vitals.ReadAt == nil {
		return 0
	}
	return r.o.Clock.Now().Sub(*r.vitals.ReadAt)
}

// progress updates counts and the time left, estimated from the points of this sitting.
func (r *Runner) progress(began time.Time, here int) {
	left := len(r.order) - len(r.points)
	per := r.o.Clock.Now().Sub(began).Seconds() / float64(max(here, 1))
	flagged := countFlagged(r.points)
	r.tell(func(v *sweeps.Vitals) {
		v.Measured, v.Flagged = len(r.points), flagged
		s := per * float64(left)
		v.TimeLeft = &s
	})
	r.changed()
}
