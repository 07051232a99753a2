package circuit

import "math"

// How fine the steps are. The capacitor moves at most a share of the supply
// in a step, and the correction of a step, a bound on its error, is kept
// below a share of the supply (of a typical load current for the winding).
const (
	maxMove    = 1. / 15
	maxFix     = 1e-4
	maxFixAmps = 2e-4
	maxSag     = 0.02 // of the supply in a step, outside constant voltage
	levelShare = 1e-7 // a level counts as reached this near, of the supply
	sameSupply = 1e-5 // the supply has not changed enough to linearise anew
)

// tick is the shortest step, s: small against any circuit, well above the
// resolution of the time itself.
func (s *Sim) tick() float64 { return math.Max(1e-12, 1e-15*s.x.Time) }

// step makes one step, at most to end, and hands it to the watchers.
func (s *Sim) step(end float64) {
	s.power()
	h, tick := s.begin(end), s.tick()
	for try := 0; ; try++ {
		s.attempt(h)
		next := s.judge(h)
		if next >= h || try > 60 || h <= tick {
			break
		}
		h = math.Max(next, tick)
	}
	s.finish(h, end)
	for _, w := range s.watchers {
		w.Observe(&s.seg)
	}
	s.compare()
	s.due()
}

// power wakes or kills the timer as its supply comes and goes.
func (s *Sim) power() {
	alive := s.x.Supply >= s.b.Timer.MinSupply && s.x.Supply > 0
	if alive == s.powered {
		return
	}
	s.powered, s.turn, s.release = alive, never, never
	s.reference, s.cycle.n = math.NaN(), 0
	if !alive {
		s.high, s.driven = false, false
		return
	}
	if s.b.Timing.Network == Clocked {
		s.turn = event{s.x.Time, true}
		return
	}
	s.flip(s.x.Capacitor < s.lower(s.x.Supply))
}

func (s *Sim) upper(vs float64) float64 { return s.b.Timer.Threshold * vs }
func (s *Sim) lower(vs float64) float64 { return s.b.Timer.Threshold * s.b.Timer.Trigger * vs }

// begin fixes what does not depend on the step's length and returns the
// longest step worth trying: nothing known in advance happens inside it.
func (s *Sim) begin(end float64) float64 {
	g, t := &s.seg, s.x.Time
	s.direct()
	load := s.draw(s.x.Current, s.x.Discharge)
	s.region = s.locate(load)
	var ends float64
	g.supply, ends = s.sourceArc(load)
	h := math.Min(float64(s.stride), ends)
	if s.way != 0 {
		h = math.Min(h, float64(s.loadStride))
	}
	for _, at := range [...]float64{end, s.turn.at, s.release.at, s.outEdge.end(t), s.loadEdge.end(t)} {
		h = math.Min(h, at-t)
	}
	if s.region != voltage {
		h = math.Min(h, s.fineness*maxSag*math.Max(s.x.Supply, 0.3)/math.Abs(g.supply.F))
	}
	h = math.Min(h, s.rotorLimit())
	h = math.Max(h, s.tick())
	g.supply.span(h)
	s.refer(g.supply.avg)
	if f := math.Abs(g.cap.F); f > 0 {
		h = math.Min(h, s.fineness*maxMove*math.Max(s.x.Supply, 0.1)/f)
	}
	if at := s.aim(); at > 0 {
		h = math.Min(h, at)
	}
	return math.Max(h, s.tick())
}

func (s *Sim) rotorLimit() float64 {
	l := &s.b.Load
	if l.Kind != Motor || !s.turning {
		return math.Inf(1)
	}
	tau := l.mechanical(s.x.Speed, l.Resistance)
	h := s.fineness * 0.1 * tau
	if per := s.unevenness(); per > 0 {
		return math.Min(h, s.fineness*0.3/(per*math.Max(s.x.Speed, 1)))
	}
	if math.Abs(s.acceleration(s.x.Current))*tau < 1e-8*s.x.Speed {
		return math.Inf(1) // nothing drives it any more; spin keeps this stable
	}
	return h
}

// direct settles which way the load current goes when it is at zero.
func (s *Sim) direct() {
	if s.b.Load.Kind != Motor {
		s.x.Current = s.resistorCurrent(s.x.Supply)
		return
	}
	if s.x.Current == 0 {
		s.loadStride = stride(math.Inf(1))
	}
	switch i := s.x.Current; {
	case i > 0:
		s.way = 1
		return
	case i < 0:
		s.way = -1
		return
	}
	vs, emf, brush := s.x.Supply, s.emf(s.x.Speed), s.b.Load.BrushDrop
	up, _ := s.loop(0, 1, vs)
	down, _ := s.loop(0, -1, vs)
	switch {
	case up-emf-brush > 1e-9:
		s.way = 1
	case down-emf+brush < -1e-9:
		s.way = -1
	default:
		s.way = 0
	}
}

func (s *Sim) emf(speed float64) float64 { return s.constant(s.x.Angle) * speed }

// refer finds the switch's drive and the capacitor's linearisation at supply vs.
func (s *Sim) refer(vs float64) {
	s.reference = vs
	s.drive(vs)
	g := &s.seg
	g.cap = arc{X: s.x.Capacitor}
	g.cap.F, g.cap.J = s.charge(s.x.Capacitor, vs)
	g.pin0, g.fed0 = s.net.pin(), s.net.fed
}

// charge gives the capacitor's slope in V/s at voltage v, and the slope's
// derivative.
func (s *Sim) charge(v, vs float64) (f, df float64) {
	t, m := &s.b.Timing, &s.b.Timer
	var i, di float64
	switch {
	case t.Network == Clocked:
		return 0, 0
	case t.Network == OutputFed:
		i, di = s.fedCharge(v, vs)
	case s.powered && !s.high:
		r7 := math.Max(m.DischargeResistance, wiring)
		rc := math.Max(s.common, wiring)
		i, di = s.net.solve((vs*r7+m.DischargeOffset*rc)/(rc+r7), rc*r7/(rc+r7), v)
	default:
		i, di = s.net.solve(vs, s.common, v)
	}
	if s.powered {
		i += m.TriggerCurrent - m.ThresholdCurrent
	}
	if t.Leak > 0 {
		i -= v / t.Leak
		di -= 1 / t.Leak
	}
	return i / t.Capacitance, di / t.Capacitance
}

// fedCharge solves network and output pin together.
func (s *Sim) fedCharge(v, vs float64) (i, di float64) {
	if !s.powered {
		s.net.fed = 0
		i, di = s.net.solve(v, 1e12, v)
		return i, di
	}
	for range 30 {
		out, _ := s.output(vs, s.x.Current, s.net.fed)
		i, di = s.net.solve(out, s.common, v)
		moved := math.Abs(s.net.source - s.net.fed)
		s.net.fed = s.net.source
		if moved < 1e-10 {
			break
		}
	}
	return i, di
}

// aim is the time to the next crossing of a level or of zero load current as
// the linearisation sees it; the step then ends just there.
func (s *Sim) aim() float64 {
	g, at := &s.seg, math.Inf(1)
	if level, ok := s.target(s.x.Supply); ok {
		at = g.cap.reach(level)
	}
	if s.way != 0 {
		s.wind(0)
		at = math.Min(at, g.load.reach(0))
	}
	return at
}

// target is the level the capacitor moves to, unless a turn is already due.
func (s *Sim) target(vs float64) (level float64, ok bool) {
	switch {
	case !s.powered || s.turn.at < math.Inf(1) || s.b.Timing.Network == Clocked:
		return 0, false
	case s.high:
		return s.upper(vs), true
	}
	return s.lower(vs), true
}
