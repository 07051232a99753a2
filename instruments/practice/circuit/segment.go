package circuit

import "math"

// A Segment is one step of the simulation: from T0 to T1 nothing switches.
// An Observer may ask it anything inside that time, but not keep it.
type Segment struct {
	T0, T1 float64 // s

	sim                      *Sim
	start                    State
	supply, cap, load, speed arc
	pin0, pin1               float64 // pin 7 at start and end, V
	fed0, fed1               float64 // into the network from the output, A
}

// An edge is the finite duration of a node's switching: it shapes what probes
// see; the circuit itself switches at once.
type edge struct{ at, duration, from float64 }

// end is when the edge ends, +Inf when that is past.
func (e edge) end(now float64) float64 {
	if end := e.at + e.duration; end > now+1e-11 {
		return end
	}
	return math.Inf(1)
}

// soften gives the node's voltage v during the edge.
func (e edge) soften(v, t float64) float64 {
	if d := t - e.at; d < e.duration && d >= 0 {
		return e.from + (v-e.from)*d/e.duration
	}
	return v
}

// freeze makes the segment stand for the present instant.
func (g *Segment) freeze() {
	g.T0, g.T1, g.start = g.sim.x.Time, g.sim.x.Time, g.sim.x
}

// High tells whether the timer's output is high.
func (g *Segment) High() bool { return g.sim.high }

// At gives the state at time t inside the segment.
func (g *Segment) At(t float64) State {
	d := t - g.T0
	x := g.start
	x.Time = t
	if g.T1 <= g.T0 {
		return x
	}
	x.Supply, x.Capacitor = math.Max(g.supply.at(d), 0), g.cap.at(d)
	x.Discharge = g.pin0 + (g.pin1-g.pin0)*d/(g.T1-g.T0)
	g.move(&x, g.load.at(d), g.speed.at(d), d)
	return x
}

// over gives the mean state between ta and tb.
func (g *Segment) over(ta, tb float64) State {
	a, b := ta-g.T0, tb-g.T0
	x := g.start
	x.Time = (ta + tb) / 2
	x.Supply, x.Capacitor = g.supply.mean(a, b), g.cap.mean(a, b)
	x.Discharge = g.pin0 + (g.pin1-g.pin0)*(a+b)/2/(g.T1-g.T0)
	g.move(&x, g.load.mean(a, b), g.speed.mean(a, b), (a+b)/2)
	return x
}

func (g *Segment) move(x *State, amps, speed, d float64) {
	if g.sim.b.Load.Kind == Motor {
		x.Current, x.Speed = amps, speed
		x.Angle += d * speed
		return
	}
	x.Current = g.sim.resistorCurrent(x.Supply)
}

// See gives what a probe sees at time t inside the segment, V or A.
func (g *Segment) See(p Probe, t float64) float64 {
	x := g.At(t)
	return g.see(p, &x)
}

// Mean gives the mean of what a probe sees between ta and tb inside the
// segment. What is linear in the state is exact; what a diode's or an output
// table's curve adds to that is taken by Simpson's rule.
func (g *Segment) Mean(p Probe, ta, tb float64) float64 {
	if tb <= ta {
		return g.See(p, ta)
	}
	m := g.over(ta, tb)
	whole := g.see(p, &m)
	if p.linear() {
		return whole
	}
	x0, x1, x2 := g.At(ta), g.At((ta+tb)/2), g.At(tb)
	y := (g.see(p, &x0) + 4*g.see(p, &x1) + g.see(p, &x2)) / 6
	s := x1
	s.Supply = (x0.Supply + 4*x1.Supply + x2.Supply) / 6
	s.Capacitor = (x0.Capacitor + 4*x1.Capacitor + x2.Capacitor) / 6
	s.Current = (x0.Current + 4*x1.Current + x2.Current) / 6
	s.Speed = (x0.Speed + 4*x1.Speed + x2.Speed) / 6
	return whole + y - g.see(p, &s)
}

// linear tells whether the probe sees state variables alone.
func (p Probe) linear() bool {
	plain := func(n Node) bool {
		return n == Common || n == Supply || n == Capacitor || n == Discharge || n == Control
	}
	switch p.current {
	case noCurrent:
		return plain(p.hi) && plain(p.lo)
	case LoadCurrent, rotor:
		return true
	}
	return false
}

func (g *Segment) see(p Probe, x *State) float64 {
	switch p.current {
	case LoadCurrent:
		return x.Current
	case rotor:
		return x.Speed
	case SupplyCurrent:
		return g.delivered(x.Supply)
	case OutputCurrent:
		_, i := g.out(x)
		return i
	}
	return g.volts(p.hi, x) - g.volts(p.lo, x)
}

func (g *Segment) out(x *State) (v, i float64) {
	fed := g.sim.net.fed
	if g.T1 > g.T0 {
		fed = g.fed0 + (g.fed1-g.fed0)*(x.Time-g.T0)/(g.T1-g.T0)
	}
	return g.sim.output(x.Supply, x.Current, fed)
}

func (g *Segment) volts(n Node, x *State) float64 {
	s := g.sim
	switch n {
	case Supply:
		return x.Supply
	case Capacitor:
		return x.Capacitor
	case Discharge:
		return x.Discharge
	case Control:
		if !s.powered {
			return 0
		}
		return s.upper(x.Supply)
	case TimerOut:
		return g.timerOut(x)
	case FlybackTop:
		return g.top(x)
	case LoadHi:
		return g.top(x) - x.Current*s.b.Load.Burden
	case LoadLo:
		return g.loadLo(x)
	}
	return 0
}

// resting tells whether no current flows in a motor: its terminals then show
// the back-EMF.
func (s *Sim) resting() bool { return s.way == 0 && s.b.Load.Kind == Motor }

func (g *Segment) timerOut(x *State) float64 {
	s := g.sim
	v, _ := g.out(x)
	if s.b.Driver.Stage == StageNone && s.resting() {
		v = s.constant(x.Angle) * x.Speed
		if s.b.Load.ToSupply {
			v = x.Supply - v
		}
	}
	return s.outEdge.soften(v, x.Time)
}

func (g *Segment) top(x *State) float64 {
	if l := &g.sim.b.Load; g.sim.b.Driver.Stage == StageNone && !l.ToSupply {
		return g.timerOut(x)
	}
	return x.Supply
}

func (g *Segment) loadLo(x *State) float64 {
	s := g.sim
	if s.b.Driver.Stage == StageNone {
		if s.b.Load.ToSupply {
			return g.timerOut(x)
		}
		return 0
	}
	var v float64
	switch l := &s.b.Load; {
	case l.Kind == Resistor && !s.driven:
		v = x.Supply
	case l.Kind == Resistor:
		v, _ = s.saturation(x.Current)
		v = math.Min(v, x.Supply)
	case s.resting():
		v = x.Supply - s.constant(x.Angle)*x.Speed
	default:
		u, _ := s.loop(x.Current, s.way, x.Supply)
		v = x.Supply - u - l.Burden*x.Current
	}
	return s.loadEdge.soften(v, x.Time)
}
