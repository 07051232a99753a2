package practice

import (
	"context"
	"math"
	"math/rand/v2"
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

func (w *world) advance(until float64) {
	w.sim.Advance(until)
	if w.after != nil {
		w.after()
	}
}

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
