package circuit

import "math"

// attempt makes the arcs of a step of length h from the present state. The
// parts are coupled through their mean values over the step: the supply feeds
// the mean current, everything else sees the mean supply, the winding sees the
// speed at mid-step, the rotor the mean current.
func (s *Sim) attempt(h float64) {
	g := &s.seg
	mean := g.supply.mean(0, h)
	if math.Abs(mean-s.reference) > 1e-7*(math.Abs(mean)+0.01) {
		s.refer(mean)
	}
	if s.b.Timing.Network != Clocked {
		fix(&g.cap, h, func(v float64) float64 {
			f, _ := s.charge(v, s.reference)
			return f
		})
	}
	g.pin1, g.fed1 = s.net.pin(), s.net.fed
	load := s.x.Current
	if s.b.Load.Kind == Motor {
		s.wind(h)
		s.spin(h)
		load = g.load.mean(0, h)
	}
	g.supply, _ = s.sourceArc(s.draw(load, (g.pin0+g.pin1)/2))
}

// fix completes an arc by the third-order exponential Rosenbrock method
// exprb32 (Hochbruck, Ostermann and Schweitzer, SIAM J. Numer. Anal. 47, 2009):
// x1 = U + 2 h φ3(hJ) (g(U) − g(x0)), with U the linearised end and g what the
// linearisation leaves of f. The correction also estimates the error.
func fix(a *arc, h float64, f func(float64) float64) {
	a.H, a.Fix = h, 0
	d := h * phi1(h*a.J) * a.F
	left := f(a.X+d) - a.F - a.J*d
	if math.Abs(left) > 1e-13*math.Abs(a.F) {
		a.Fix = 2 * h * phi3(h*a.J) * left
	}
}

// wind makes the winding's arc: L di/dt = u(i) − R i − E − brush.
func (s *Sim) wind(h float64) {
	g, l := &s.seg, &s.b.Load
	g.load = arc{X: s.x.Current, H: h}
	if s.way == 0 {
		return
	}
	r, back := s.winding(), s.emf(s.x.Speed+h/2*s.acceleration(s.x.Current))
	back += float64(s.way) * l.BrushDrop
	slope := func(i float64) (f, df float64) {
		u, du := s.loop(i, s.way, s.reference)
		return (u - r*i - back) / l.Inductance, (du - r) / l.Inductance
	}
	g.load.F, g.load.J = slope(g.load.X)
	if h == 0 {
		return
	}
	fix(&g.load, h, func(i float64) float64 {
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
	return (l.constant(s.x.Angle)*current - l.drag(s.x.Speed, s.x.Angle)) / l.Inertia
}

// spin makes the speed's arc from the mean current.
func (s *Sim) spin(h float64) {
	g := &s.seg
	g.speed = arc{X: s.x.Speed, F: s.acceleration(g.load.mean(0, h)), H: h}
}

// judge gives the longest step, at most h, that the attempt of length h says
// is right: no larger correction than allowed, and no level or zero of the
// current passed by more than a trace.
func (s *Sim) judge(h float64) float64 {
	g, next := &s.seg, h
	vs := g.supply.at(h)
	scale := s.fineness * s.fineness * math.Max(vs, 0.1)
	worst := math.Abs(g.cap.Fix) / (maxFix * scale)
	if s.way != 0 {
		amps := math.Abs(g.load.X) + 0.02*scale/s.b.Load.Resistance
		worst = math.Max(worst, math.Abs(g.load.Fix)/(maxFixAmps*amps))
	}
	if worst > 1 {
		next = h * math.Max(0.2, 0.9*math.Pow(worst, -1./3))
		s.h = next
		return next
	}
	if level, ok := s.target(vs); ok {
		next = math.Min(next, back(h, g.cap.X, g.cap.at(h), level, levelShare*scale, s.high))
	}
	if s.way != 0 {
		next = math.Min(next, back(h, g.load.X, g.load.at(h), 0, s.trace(), s.way < 0))
	}
	if next >= h {
		s.h = math.Max(s.longer(h, worst), s.h)
		if h >= s.h {
			s.h = s.longer(h, worst)
		}
	}
	return next
}

func (s *Sim) longer(h, worst float64) float64 {
	return h * math.Min(4, 0.9*math.Pow(math.Max(worst, 1e-3), -1./3))
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
	x.Time, x.Supply, x.Capacitor, x.Discharge = g.T1, math.Max(g.supply.at(h), 0), g.cap.at(h), g.pin1
	if s.b.Load.Kind == Motor {
		s.coast(h)
	} else {
		x.Current = s.resistorCurrent(x.Supply)
	}
}

// coast takes current, speed, angle and winding temperature to the step's end.
func (s *Sim) coast(h float64) {
	g, x, l := &s.seg, &s.x, &s.b.Load
	x.Current = g.load.at(h)
	if s.way != 0 && float64(s.way)*x.Current <= s.trace() && float64(s.way)*g.load.F <= 0 {
		x.Current = 0
	}
	if l.ThermalResistance > 0 {
		rms := g.load.mean(0, h)
		heat := rms * rms * s.winding()
		x.Winding += h * (heat - (x.Winding-s.ambient)/l.ThermalResistance) / l.ThermalCapacity
	}
	x.Angle = math.Mod(x.Angle+h*g.speed.at(h/2), 2*math.Pi)
	x.Speed = g.speed.at(h)
	switch {
	case s.turning && x.Speed <= 1e-6 && g.speed.F <= 0:
		x.Speed, s.turning = 0, false
	case !s.turning && !s.locked && l.constant(x.Angle)*math.Max(x.Current, g.load.X) > l.StaticTorque:
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
