package circuit

import "math"

// How leaping judges and what it spends.
const (
	cyclesBefore  = 3    // periods integrated before each leap
	samePeriod    = 1e-5 // share by which the last two periods may differ
	sameState     = 2e-5 // share of full scale by which their starts may differ
	settledShare  = 1e-4 // of the speed still to come: the rotor has settled
	leapShare     = 0.1  // of the rotor's time constant in a leap before that
	settledRise   = 0.05 // K still to come: the winding has settled
	leapRise      = 0.3  // K in a leap before that
	runDown       = 1e-3 // V; a supply that is off and still above it runs down: nothing repeats
	restlessSpans = 100  // rotor time constants after which a restless board is at its mean
)

// A cycle is what is known of the board's repetition: the state at the last
// rising turns of the output, and how the slow states moved between them.
type cycle struct {
	n            int // rising turns since the last disturbance or leap
	fresh        bool
	last, before State // at the last two turns
	period       float64
	steady       bool // the last two periods agree

	since              float64 // when the board was last disturbed or leapt, s
	rate, speed        float64 // the rotor's acceleration at an earlier leap, and its speed then
	haveRate, haveTime bool
}

// reset forgets: something was changed from outside.
func (c *cycle) reset() { *c = cycle{} }

// turned notes a rising turn.
func (c *cycle) turned(s *Sim) {
	period := s.x.Time - c.last.Time
	c.steady = c.n > 1 && math.Abs(period-c.period) < samePeriod*period
	c.before, c.last, c.period = c.last, s.x, period
	c.n++
	c.fresh = true
}

// repeats tells whether the fast states started the last two periods alike.
func (c *cycle) repeats(s *Sim) bool {
	full := math.Max(s.x.Supply, 0.1)
	return c.n > cyclesBefore && c.steady &&
		math.Abs(c.last.Supply-c.before.Supply) < sameState*full &&
		math.Abs(c.last.Current-c.before.Current) < sameState*full/s.b.Load.Resistance
}

// A carried observer needs no integration of periods that are all alike: it takes
// what the last whole one gave as many times as are leapt over.
type carried interface {
	// span is how long it looks in all, s.
	span() float64
	// turn notes a rising turn of the output at time t.
	turn(t float64)
	// ready tells whether the last whole period was seen in full.
	ready(period float64) bool
	// carry adds m periods like the last one.
	carry(m float64)
}

// leap moves the time on over whole periods when the board repeats itself,
// taking the slow states (speed, winding temperature) along at the rate of the
// last period; with observers to be carried only when those have settled. It
// reports whether it did.
func (s *Sim) leap(end float64, carried []carried) bool {
	c := &s.cycle
	if !c.haveTime {
		c.since, c.haveTime = s.x.Time, true
	}
	if s.turning && s.unevenness() > 0 || !c.fresh || !c.repeats(s) {
		return len(carried) == 0 && s.leapRestless(end)
	}
	for _, o := range carried {
		if !o.ready(c.period) {
			return false
		}
	}
	c.fresh = false
	span := end - s.x.Time
	tau := s.rotorConstant()
	rate := (c.last.Speed - c.before.Speed) / c.period
	if s.turning && math.Abs(rate)*tau.long > settledShare*math.Max(s.x.Speed, 1) {
		if len(carried) > 0 {
			return false
		}
		span = math.Min(span, leapShare*tau.likely)
	}
	warm, heat := s.warming()
	if math.Abs(heat)*warm > settledRise {
		span = math.Min(span, leapRise/math.Abs(heat))
	}
	m := math.Floor(span / c.period)
	if m < 2*cyclesBefore {
		return false
	}
	c.rate, c.speed, c.haveRate = rate, s.x.Speed, true
	span = m * c.period
	if s.turning {
		s.x.Speed = math.Max(0, s.x.Speed+relax(rate, tau.likely, span))
	}
	s.x.Winding += relax(heat, warm, span)
	for _, o := range carried {
		o.carry(m)
	}
	s.shift(span)
	return true
}

// relax is how far a state goes in a span when it moves at rate now and
// settles with time constant tau.
func relax(rate, tau, span float64) float64 {
	if math.IsInf(tau, 1) {
		return rate * span
	}
	return -rate * tau * math.Expm1(-span/tau)
}

// constants of the rotor: the likely one, and one surely not shorter.
type constants struct{ likely, long float64 }

// rotorConstant is the time constant with which the mean speed settles. The
// textbook one holds with continuous current and is a lower bound otherwise;
// two rates at two speeds tell the true one.
func (s *Sim) rotorConstant() constants {
	l, c := &s.b.Load, &s.cycle
	if l.Kind != Motor || !s.turning {
		return constants{math.Inf(1), 0}
	}
	short := l.mechanical(s.x.Speed, s.winding()+l.Burden)
	rate := (c.last.Speed - c.before.Speed) / c.period
	if dw := s.x.Speed - c.speed; c.haveRate && math.Abs(dw) > 1e-4*s.x.Speed {
		if tau := -dw / (rate - c.rate); tau > short && tau < 50*short {
			return constants{tau, 2 * tau}
		}
	}
	return constants{short, 20 * short}
}

// warming is the winding's thermal time constant in s and its present rate in K/s.
func (s *Sim) warming() (tau, rate float64) {
	l, c := &s.b.Load, &s.cycle
	if l.ThermalResistance == 0 {
		return math.Inf(1), 0
	}
	return l.ThermalResistance * l.ThermalCapacity, (c.last.Winding - c.before.Winding) / c.period
}

// leapRestless is for a board that never quite repeats: cogging out of step
// with the PWM, a supply that starves and recovers. Long after a disturbance it
// is at its mean, so the middle of a long wait is left out and its end
// integrated, which also covers a board that merely needs longer.
func (s *Sim) leapRestless(end float64) bool {
	c, l := &s.cycle, &s.b.Load
	if !s.enabled && s.x.Supply > runDown {
		return false
	}
	whole := c.n > cyclesBefore
	wait, unit := 1.0, 1e-3
	if whole {
		wait, unit = math.Max(wait, 100*c.period), c.period
	}
	if l.Kind == Motor {
		wait = math.Max(wait, restlessSpans*l.mechanical(s.x.Speed, s.winding()+l.Burden))
	}
	if s.x.Time-c.since < wait || whole && !c.fresh && s.x.Time-c.last.Time < 2*c.period {
		return false
	}
	m := math.Floor((end - s.x.Time - wait) / unit)
	if m*unit < wait {
		return false
	}
	s.shift(m * unit)
	return true
}

// shift moves the board in time as it is.
func (s *Sim) shift(span float64) {
	s.x.Time += span
	s.turn.at += span
	s.release.at += span
	s.outEdge.at += span
	s.loadEdge.at += span
	if s.turning {
		s.x.Angle = math.Mod(s.x.Angle+span*s.x.Speed, 2*math.Pi)
	}
	c := &s.cycle
	c.n, c.fresh, c.since = 0, false, s.x.Time
}
