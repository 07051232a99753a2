package circuit

import "math"

// A region is where the bench supply works.
type region uint8

const (
	idle    region = iota // off, or its output held above the set voltage
	voltage               // constant voltage
	current               // constant current
)

// locate finds the region for the present supply voltage and board current.
// Exactly on an edge, where every crossing lands, the trend decides.
func (s *Sim) locate(load float64) region {
	if !s.enabled {
		return idle
	}
	v, lo, hi := s.x.Supply, s.set-s.b.Source.Resistance*s.limit, s.set
	eps := 1e-9 * (1 + hi)
	switch {
	case v < lo-eps, v <= lo+eps && load > s.limit:
		return current
	case v > hi+eps, v >= hi-eps && load < 0:
		return idle
	}
	return voltage
}

// sourceArc is the supply node over the coming step, the source as its region
// says, the board drawing load: a conductance if the load is one or the
// voltage is left to itself, a motor's given current otherwise. It also gives
// the time at which the region ends.
func (s *Sim) sourceArc(load float64) (a arc, ends float64) {
	src := &s.b.Source
	v := s.x.Supply
	g := 0.0
	if (s.region != voltage || s.b.Load.Kind == Resistor) && load > 0 && v > 1e-3 {
		g = load / v
	}
	in, gs := 0.0, 0.0
	switch s.region {
	case voltage:
		gs = 1 / src.Resistance
		in = (s.set - v) * gs
	case current:
		in = s.limit
	}
	if src.Bleed > 0 {
		load += v / src.Bleed
		g += 1 / src.Bleed
	}
	a = arc{X: v, F: (in - load) / src.Bulk, J: -(g + gs) / src.Bulk}
	ends = math.Inf(1)
	if s.enabled {
		for _, edge := range [2]float64{s.set - src.Resistance*s.limit, s.set} {
			if t := a.reach(edge); t > 0 && s.leaves(edge) {
				ends = math.Min(ends, t)
			}
		}
	}
	return a, ends
}

// leaves tells whether reaching this edge ends the present region.
func (s *Sim) leaves(edge float64) bool {
	if s.region == idle && edge != s.set || s.region == current && edge == s.set {
		return false
	}
	return math.Abs(edge-s.x.Supply) > 1e-12*(1+edge)
}

// draw is the current the board takes from its supply node, A, at a load
// current and pin 7 voltage. Current that freewheels round the load does not
// pass here.
func (s *Sim) draw(load, pin float64) float64 {
	b, vs := &s.b, s.x.Supply
	i := vs * s.short
	if s.powered {
		i += quiescent(b.Timer.Quiescent, vs)
	}
	if b.Timing.Network < OutputFed {
		i += (vs - pin) / math.Max(s.common, wiring)
	}
	if s.powered && s.high {
		_, out := s.output(vs, load, s.net.fed)
		i += out
	}
	if b.Driver.Stage == StageNone {
		if !b.Load.ToSupply {
			return i // through the pin, or freewheeling below ground
		}
		if s.high || load > 0 {
			i += load // when high, what the pin sinks comes straight back
		}
		return i
	}
	if s.driven || load < 0 || b.Flyback == nil {
		i += load
	}
	return i
}

// delivered is the source's own current at a supply voltage, A.
func (g *Segment) delivered(vs float64) float64 {
	switch g.sim.region {
	case voltage:
		return math.Min(math.Max((g.sim.set-vs)/g.sim.b.Source.Resistance, 0), g.sim.limit)
	case current:
		return g.sim.limit
	}
	return 0
}
