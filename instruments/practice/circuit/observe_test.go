package circuit

import (
	"math"
	"strings"
	"testing"
)

// TestMeanAgreesWithRecord: the mean over an aperture is that of a dense
// record, for every node pair and current.
func TestMeanAgreesWithRecord(t *testing.T) {
	s := spinning(t, 5e3)
	s.Advance(3)
	probes := []Probe{
		Between(Supply, Common), Between(TimerOut, Common), Between(Capacitor, Common), Between(Discharge, Common), Between(Control, Common),
		Between(LoadHi, LoadLo), Between(FlybackTop, LoadHi), Through(LoadCurrent), Through(SupplyCurrent), Through(OutputCurrent), RotorSpeed(),
	}
	const n = 40000
	t0, t1 := s.Now()+0.0003, s.Now()+0.0203
	dt := (t1 - t0) / n
	r := NewRecord(t0+dt/2, dt, n, probes...)
	observers := []Observer{r}
	var means []*Mean
	for _, p := range probes {
		m := NewMean(p, t0, t1)
		means, observers = append(means, m), append(observers, m)
	}
	mustRun(t, s, t1, observers...)
	for k, m := range means {
		sum, lo, hi := 0.0, math.Inf(1), math.Inf(-1)
		for _, y := range r.Y[k] {
			sum, lo, hi = sum+y, math.Min(lo, y), math.Max(hi, y)
		}
		span := math.Max(hi-lo, math.Abs(hi)) + 1e-9
		if d := math.Abs(sum/n-m.Value()) / span; !(d < 4e-4) {
			t.Errorf("probe %d: mean %.7g, record says %.7g", k, m.Value(), sum/n)
		}
		if m.Max < hi-1e-3*span || m.Min > lo+1e-3*span || m.Max > hi+0.02*span || m.Min < lo-0.02*span {
			t.Errorf("probe %d: range %.6g to %.6g, record says %.6g to %.6g", k, m.Min, m.Max, lo, hi)
		}
	}
}

// TestBeating: an aperture of whole periods reads steadily, one of ten and a
// half beats with the PWM.
func TestBeating(t *testing.T) {
	s := spinning(t, 5e3)
	s.Advance(3)
	high, low := phases(t, s, 0.05)
	spread := func(periods float64) float64 {
		lo, hi := math.Inf(1), math.Inf(-1)
		for range 20 {
			m := NewMean(Between(TimerOut, Common), s.Now(), s.Now()+periods*(high+low))
			mustRun(t, s, m.T1, m)
			lo, hi = math.Min(lo, m.Value()), math.Max(hi, m.Value())
		}
		return hi - lo
	}
	if whole, beat := spread(10), spread(10.5); whole > 2e-3 || beat < 0.1 {
		t.Errorf("spread of readings %.5f V over whole periods, %.5f V over ten and a half", whole, beat)
	}
}

// TestWatchedWhileOthersAdvance: an observer registered once sees its whole
// window, in however many pieces the time moves, and the reading is the same.
func TestWatchedWhileOthersAdvance(t *testing.T) {
	read := func(pieces int) float64 {
		s := spinning(t, 5e3)
		m := NewMean(Between(LoadHi, LoadLo), 0.6, 0.9)
		if err := s.Watch(m); err != nil {
			t.Fatal(err)
		}
		for k := range pieces {
			s.Advance(0.5 + 0.5*float64(k+1)/float64(pieces))
		}
		return m.Value()
	}
	near(t, "reading in 97 pieces", read(97), read(1), 2e-4)
}

func TestWatchRefusesThePast(t *testing.T) {
	s := mustNew(t, pump(), 9)
	s.Advance(1)
	for _, o := range []Observer{NewMean(RotorSpeed(), 0.5, 2), NewMean(RotorSpeed(), 3, 2), NewMean(RotorSpeed(), 1, math.Inf(1))} {
		if err := s.Watch(o); err == nil || !strings.Contains(err.Error(), "can't look") {
			t.Errorf("want a refusal, got %v", err)
		}
	}
	if err := s.Watch(NewMean(RotorSpeed(), 1, 2)); err != nil {
		t.Errorf("a window from now on: %v", err)
	}
	s.Advance(0.5)
	if s.Now() != 1 {
		t.Errorf("an earlier time moved the board to %g s", s.Now())
	}
}

// TestEdgeDuration: the output's edges take their time, seen by a fast scope.
func TestEdgeDuration(t *testing.T) {
	s := mustNew(t, pump(), 9)
	if err := s.SetPot(5e3); err != nil {
		t.Fatal(err)
	}
	s.Advance(0.1)
	r := NewRecord(s.Now(), 4e-9, 400000, Between(TimerOut, Common))
	mustRun(t, s, s.Now()+1.6e-3, r)
	y := r.Y[0]
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, v := range y {
		lo, hi = math.Min(lo, v), math.Max(hi, v)
	}
	at := func(from int, level float64) int {
		for k := from; ; k++ {
			if y[k-1] < level && y[k] >= level {
				return k
			}
		}
	}
	a := at(1, lo+0.1*(hi-lo))
	b := at(a+1, lo+0.9*(hi-lo))
	inside(t, "10 to 90 % rise, ns", float64(b-a)*4, 70, 95)
}
