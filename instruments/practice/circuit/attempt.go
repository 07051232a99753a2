package circuit

import "math"

// attempt makes the arcs of a step of length h from the present state. The
// parts are coupled through their mean values over the step: the supply feeds
// the mean current, everything else sees the mean supply, the winding sees the
// speed at mid-step, the rotor the mean current.
func (s *Sim) attempt(h float64) {
	g := &s.seg
	if s.way != 0 { // what the linearised winding will draw
		g.load.span(h)
		g.supply, _ = s.sourceArc(s.draw(g.load.avg, g.pin0))
	}
	g.supply.span(h)
	if mean := g.supply.avg; math.Abs(mean-s.reference) > sameSupply*(math.Abs(mean)+0.01) {
		s.refer(mean)
	}
	g.cap.span(h)
	if s.b.Timing.Network != Clocked {
		fix(&g.cap, func(v float64) float64 {
			f, _ := s.charge(v, s.reference)
			return f
		})
	}
	g.pin1, g.fed1 = s.net.pin(), s.net.fed
	load := s.x.Current
	if s.b.Load.Kind == Motor {
		s.wind(h)
		s.spin(h)
		load = g.load.avg
	}
	g.supply, _ = s.sourceArc(s.draw(load, (g.pin0+g.pin1)/2))
	g.supply.span(h)
}

// fix completes an arc by the third-order exponential Rosenbrock method
// exprb32 (Hochbruck, Ostermann and Schweitzer, SIAM J. Numer. Anal. 47, 2009):
// x1 = U + 2 h φ3(hJ) (g(U) − g(x0)), with U the linearised end and g what the
// linearisation leaves of f. The correction also estimates the error.
func fix(a *arc, f func(float64) float64) {
	a.Fix = 0
	left := f(a.end) - a.F - a.J*(a.end-a.X)
	if math.Abs(left) > 1e-12*math.Abs(a.F) {
		a.correct(2 * a.H * phi3(a.H*a.J) * left)
	}
}

// wind makes the winding's arc: L di/dt = u(i) − R i − E − brush. E is the mean
// over the step for a current that grows in line from its start to the mean
// last estimated.
func (s *Sim) wind(h float64) {
	g, l := &s.seg, &s.b.Load
	ahead := g.load.avg
	g.load = arc{X: s.x.Current}
	if s.way == 0 {
		g.load.span(h)
		return
	}
	r, back := s.winding(), s.emf(s.x.Speed)
	if h > 0 {
		back = s.emf(s.x.Speed + h/2*s.acceleration((g.load.X+2*ahead)/3))
	}
	back += float64(s.way) * l.BrushDrop
	slope := func(i float64) (f, df float64) {
		u, du := s.loop(i, s.way, s.reference)
		return (u - r*i - back) / l.Inductance, (du - r) / l.Inductance
	}
	g.load.F, g.load.J = slope(g.load.X)
	if h == 0 {
		return
	}
	g.load.span(h)
	fix(&g.load, func(i float64) float64 {
		if i*float64(s.way) < 0 {
			i = 0
		}
		f, _ := slope(i)
		return f
	})
}

func (s *Sim) acceleration(current float64) float64 {
	l := &s.b.Load
	if !s.turning {
		return 0
	}
	return (s.constant(s.x.Angle)*current - s.drag(s.x.Speed, s.x.Angle)) / l.Inertia
}

// spin makes the speed's arc from the mean current. A step longer than the
// rotor's time constant is only made where nothing changes any more; what is
// left then dies out instead of growing with the step.
func (s *Sim) spin(h float64) {
	g := &s.seg
	g.speed = arc{X: s.x.Speed, F: s.acceleration(g.load.avg)}
	if tau := s.b.Load.mechanical(s.x.Speed, s.b.Load.Resistance); h > tau {
		g.speed.J = -1 / tau
	}
	g.speed.span(h)
}

// judge gives the longest step, at most h, that the attempt of length h says
// is right: no larger correction than allowed, and no level or zero of the
// current passed by more than a trace.
func (s *Sim) judge(h float64) float64 {
	g, next := &s.seg, h
	vs := g.supply.end
	scale := s.fineness * s.fineness * math.Max(vs, 0.1)
	next = math.Min(next, s.stride.after(h, math.Abs(g.cap.Fix)/(maxFix*scale)))
	if s.way != 0 {
		amps := maxFixAmps * (math.Abs(g.load.X) + 0.2*scale/s.b.Load.Resistance)
		next = math.Min(next, s.loadStride.after(h, math.Abs(g.load.Fix)/amps))
	}
	if next < h {
		return next
	}
	if level, ok := s.target(vs); ok {
		next = math.Min(next, back(h, g.cap.X, g.cap.end, level, levelShare*scale, s.high))
	}
	if s.way != 0 {
		next = math.Min(next, back(h, g.load.X, g.load.end, 0, s.trace(), s.way < 0))
	}
	return next
}

// A stride is the step length one state variable allows, s.
type stride float64

// after learns from a step of length h whose correction was a share of what
// is allowed, and returns the length that would have been right, at most h.
func (d *stride) after(h, share float64) float64 {
	if share > 1 {
		h *= math.Max(0.2, 0.9/math.Cbrt(share))
		*d = stride(h)
		return h
	}
	longer := stride(4 * h)
	if share > 0.01 {
		longer = stride(h * 0.9 / math.Cbrt(share))
	}
	if stride(h) >= *d || longer > *d {
		*d = longer
	}
	return h
}

// trace is a load current not worth following, A.
func (s *Sim) trace() float64 {
	return 1e-7 * math.Max(s.x.Supply, 1) / s.b.Load.Resistance
}

// back shortens a step that took x from x0 past level, in the direction
// rising, by more than tol.
func back(h, x0, x1, level, tol float64, rising bool) float64 {
	past, before := x1-level, level-x0
	if !rising {
		past, before = -past, -before
	}
	if past <= tol || before <= 0 {
		return h
	}
	return h * math.Min(before/(before+past), 0.999999)
}

// finish takes the state to the step's end.
func (s *Sim) finish(h, end float64) {
	g, x := &s.seg, &s.x
	g.T0, g.T1, g.start = x.Time, x.Time+h, *x
	if math.Abs(g.T1-end) <= s.tick() {
		g.T1 = end
	}
	x.Time, x.Supply, x.Capacitor, x.Discharge = g.T1, math.Max(g.supply.end, 0), g.cap.end, g.pin1
	if s.b.Load.Kind == Motor {
		s.coast(h)
	} else {
		x.Current = s.resistorCurrent(x.Supply)
	}
}

// coast takes current, speed, angle and winding temperature to the step's end.
func (s *Sim) coast(h float64) {
	g, x, l := &s.seg, &s.x, &s.b.Load
	x.Current = g.load.end
	if s.way != 0 && float64(s.way)*x.Current <= s.trace() && float64(s.way)*g.load.F <= 0 {
		x.Current = 0
	}
	if l.ThermalResistance > 0 {
		tau := l.ThermalResistance * l.ThermalCapacity
		heat := (g.load.X*g.load.X + 4*g.load.avg*g.load.avg + g.load.end*g.load.end) / 6 * s.winding()
		x.Winding += relax((heat*l.ThermalResistance-(x.Winding-s.ambient))/tau, tau, h)
	}
	x.Angle = math.Mod(x.Angle+h*g.speed.avg, 2*math.Pi)
	x.Speed = g.speed.end
	switch {
	case s.turning && x.Speed <= 1e-6 && g.speed.F <= 0:
		x.Speed, s.turning = 0, false
	case !s.turning && !s.locked && s.constant(x.Angle)*math.Max(x.Current, g.load.X) > l.StaticTorque:
		s.turning = true
	}
}

// compare lets the timer's comparators see the capacitor.
func (s *Sim) compare() {
	level, ok := s.target(s.x.Supply)
	if !ok {
		return
	}
	tol := levelShare * math.Max(s.x.Supply, 0.1)
	if s.high && s.x.Capacitor >= level-tol || !s.high && s.x.Capacitor <= level+tol {
		s.turn = event{s.x.Time + s.b.Timer.Delay, !s.high}
	}
}

// due carries out the events whose time has come.
func (s *Sim) due() {
	now := s.x.Time + s.tick()/2
	if s.release.at <= now {
		s.release = never
		s.open()
	}
	if s.turn.at > now {
		return
	}
	high := s.turn.high
	s.turn = never
	s.flip(high)
	if t := &s.b.Timing; t.Network == Clocked {
		span := t.Duty
		if !high {
			span = 1 - span
		}
		s.turn = event{s.x.Time + span*t.Period, !high}
	}
}

// flip turns the timer's output, and the switch with it.
func (s *Sim) flip(high bool) {
	s.seg.freeze()
	was, low := s.seg.see(Between(TimerOut, Common), &s.x), s.seg.see(Between(LoadLo, Common), &s.x)
	rise := s.b.Timer.Fall
	if high {
		rise = s.b.Timer.Rise
	}
	s.outEdge = edge{s.x.Time, rise, was}
	if high && !s.high {
		s.cycle.turned(s)
		for _, w := range s.watchers {
			if o, ok := w.Observer.(carried); ok {
				o.turn(s.x.Time)
			}
		}
	}
	s.high = high
	switch d := &s.b.Driver; {
	case d.Stage == StageNone:
		s.loadEdge = edge{s.x.Time, rise, low}
	case high:
		s.loadEdge = edge{s.x.Time, d.Edge, low}
		s.driven, s.release = true, never
	case d.Storage > 0:
		s.release = event{at: s.x.Time + d.Storage}
	default:
		s.open()
	}
}

// open ends the switch's conduction.
func (s *Sim) open() {
	s.seg.freeze()
	s.loadEdge = edge{s.x.Time, s.b.Driver.Edge, s.seg.see(Between(LoadLo, Common), &s.x)}
	s.driven = false
}
