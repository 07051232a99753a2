package practice

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"sync"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
)

// world is the simulated board in bench time. Several instruments look at it; it
// is advanced when one does. The lock is held over computing only, never over a wait.
type world struct {
	clock instruments.Clock

	mu    sync.Mutex
	sim   *circuit.Sim
	after func() // looks at what the advance brought: protections; may be nil
	ticks []*tick
	slow  []*slow
}

// tick is something due at an instant of bench time, whoever advances the board over it.
type tick struct {
	at float64 // s; +Inf: not due
	do func(*circuit.Sim)
}

// slow is something that goes on by itself so slowly that it need not break a span that
// nobody looks at: it is caught up with when somebody does.
type slow struct {
	every float64 // s
	last  float64 // s, when it was caught up with
	do    func(s *circuit.Sim, span float64)
}

// now is bench time in s.
func (w *world) now() float64 { return w.clock.Elapsed().Seconds() }

// do advances the board to the present and lets f look at it or change it.
func (w *world) do(f func(s *circuit.Sim)) {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.advance(w.now())
	f(w.sim)
}

// advance takes the board to an instant, and on the way does what falls due.
func (w *world) advance(until float64) {
	for {
		t := w.next(until)
		if t == nil {
			break
		}
		w.sim.Advance(t.at)
		t.at = math.Inf(1)
		t.do(w.sim)
	}
	w.sim.Advance(until)
	for _, x := range w.slow {
		if span := w.sim.Now() - x.last; span >= x.every {
			x.last = w.sim.Now()
			x.do(w.sim, span)
		}
	}
	if w.after != nil {
		w.after()
	}
}

// next is the earliest tick due until then; nil where there is none.
func (w *world) next(until float64) (first *tick) {
	for _, t := range w.ticks {
		if t.at <= until && (first == nil || t.at < first.at) {
			first = t
		}
	}
	return first
}

// timer adds a tick that is not due yet; whoever sets its at holds the world's lock.
func (w *world) timer(do func(*circuit.Sim)) *tick {
	t := &tick{at: math.Inf(1), do: do}
	w.mu.Lock()
	defer w.mu.Unlock()
	w.ticks = append(w.ticks, t)
	return t
}

// every catches up with something slow, each period (s) at most, until it is stopped.
func (w *world) every(period float64, do func(s *circuit.Sim, span float64)) (stop func()) {
	x := &slow{every: period, do: do}
	w.do(func(s *circuit.Sim) {
		x.last = s.Now()
		w.slow = append(w.slow, x)
	})
	return func() {
		w.mu.Lock()
		defer w.mu.Unlock()
		w.slow = slices.DeleteFunc(w.slow, func(o *slow) bool { return o == x })
	}
}

// wall is bench time that a time on the wall takes, s: what guards a link is not sped up.
func (w *world) wall(s float64) float64 { return s * w.clock.Pace() }

// mean integrates a probe over an aperture (s) that begins now, waits for its end and gives the result.
func (w *world) mean(ctx context.Context, p circuit.Probe, aperture float64) (*circuit.Mean, error) {
	var m *circuit.Mean
	w.do(func(s *circuit.Sim) {
		m = circuit.NewMean(p, s.Now(), s.Now()+aperture)
		if err := s.Watch(m); err != nil {
			panic(err) // the window begins at the board's own present
		}
	})
	if err := w.clock.Sleep(ctx, seconds(aperture)); err != nil {
		return nil, err
	}
	w.mu.Lock()
	defer w.mu.Unlock()
	w.advance(math.Max(w.now(), m.T1))
	return m, nil
}

func seconds(s float64) time.Duration { return time.Duration(s * float64(time.Second)) }

// faulty is an instrument's own error, fixed for its life: gain and offset drawn
// within the stated limits (rectangular), and noise a reading.
type faulty struct{ gain, offset float64 }

func draw(r *rand.Rand, gain, offset float64) faulty {
	return faulty{gain: gain * (2*r.Float64() - 1), offset: offset * (2*r.Float64() - 1)}
}

func (f faulty) of(x float64) float64 { return x*(1+f.gain) + f.offset }

// quantise rounds x to steps.
func quantise(x, step float64) float64 { return math.Round(x/step) * step }
