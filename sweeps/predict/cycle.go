package predict

import "math"

// source is what drives the load's terminals: v − r·i, with i into the load's upper terminal.
type source struct{ v, r float64 }

// state is what the load's terminals are connected to.
type state int

const (
	driven  state = iota // the driver is on, current flows forwards
	clamped              // on, but the current still flows backwards
	free                 // off, the current freewheels
	braked               // off, the winding drives a current backwards through the output
	resting              // off and no current: the terminals show the back-EMF
	states
)

// spell is what passes in one state over a period: time, ∫i dt, ∫i² dt, ∫v dt across the load's terminals.
type spell struct{ t, q, sq, volts float64 }

// cycle is one PWM period of a winding at constant back-EMF.
type cycle struct {
	on, off  float64 // s
	sources  [states]source
	reverses bool    // the output conducts backwards too
	r, l     float64 // winding
	burden   float64 // Ω in series, outside the terminals
	brush    float64 // V, against the current
}

// wave is the steady state of a cycle.
type wave struct {
	spells [states]spell
	start  float64 // A at the moment the driver turns on
	peak   float64 // A, largest forwards
	end    float64 // A at the end of the period; equal to start when steady
}

func (w *wave) period() (t float64) {
	for i := range w.spells {
		t += w.spells[i].t
	}
	return t
}

// current is the mean over the period, voltage the mean across the load's terminals.
func (w *wave) current() (i float64) {
	for k := range w.spells {
		i += w.spells[k].q
	}
	return i / w.period()
}

func (w *wave) voltage() (v float64) {
	for k := range w.spells {
		v += w.spells[k].volts
	}
	return v / w.period()
}

// steady finds the current that repeats from period to period. The map from
// start to end is piecewise affine and contracts, so a secant meets it in three passes where one piece holds.
func (c *cycle) steady(emf float64) wave {
	a := c.pass(0, emf)
	if a.end == 0 {
		return a
	}
	b := c.pass(a.end, emf)
	for range 40 {
		ga, gb := a.end-a.start, b.end-b.start
		if math.Abs(gb) <= 1e-12*(math.Abs(b.peak)+math.Abs(b.start)) || ga == gb {
			break
		}
		next := b.start - gb*(b.start-a.start)/(gb-ga)
		a, b = b, c.pass(next, emf)
	}
	return b
}

// pass follows the current through one period from a given start.
func (c *cycle) pass(start, emf float64) wave {
	w := wave{start: start, peak: math.Max(start, 0)}
	i := c.phase(&w, start, emf, c.on, driven, clamped)
	w.peak = math.Max(w.peak, i)
	w.end = c.phase(&w, i, emf, c.off, free, braked)
	return w
}

// phase follows the current for the time t: forwards in one state, backwards in
// another, or at rest where neither drives it. The current changes sign at most once.
func (c *cycle) phase(w *wave, i, emf, t float64, forwards, backwards state) float64 {
	for range 3 {
		s := c.which(i, emf, forwards, backwards)
		if s == resting {
			w.spells[resting].add(spell{t: t, volts: emf * t})
			return 0
		}
		src := c.sources[s]
		r := src.r + c.burden + c.r
		against := emf + c.brush
		if s == backwards {
			against = emf - c.brush
		}
		aim := (src.v - against) / r
		if c.l == 0 {
			if aim*i < 0 { // dies out at once
				i = 0
				continue
			}
			w.spells[s].add(spell{t, aim * t, aim * aim * t, src.v*t - (src.r+c.burden)*aim*t})
			return aim
		}
		tau := c.l / r
		run := t
		if aim*i < 0 {
			run = math.Min(t, tau*math.Log1p(-i/aim))
		}
		e := math.Exp(-run / tau)
		end := aim + (i-aim)*e
		q := aim*run + tau*(i-end)
		sq := aim*aim*run + 2*aim*tau*(i-end) + (i-aim)*(i-aim)*tau/2*(1-e*e)
		w.spells[s].add(spell{run, q, sq, src.v*run - (src.r+c.burden)*q})
		if t -= run; t <= 0 {
			return end
		}
		i = 0
	}
	return i
}

func (s *spell) add(o spell) { s.t += o.t; s.q += o.q; s.sq += o.sq; s.volts += o.volts }

// which state a current is in; at no current, the one that the voltages drive it into.
func (c *cycle) which(i, emf float64, forwards, backwards state) state {
	switch {
	case i > 0:
		return forwards
	case i < 0:
		return backwards
	case c.sources[forwards].v-emf-c.brush > 0:
		return forwards
	case c.reverses && c.sources[backwards].v-emf+c.brush < 0:
		return backwards
	}
	return resting
}
