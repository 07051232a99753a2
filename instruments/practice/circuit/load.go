package circuit

import "math"

// blocked stands for a voltage no back-EMF reaches: no current that way.
const blocked = 1e4

// loop gives what drives current i through load and meter, in the direction
// way (+1 or −1): V(flyback_top) − V(load_lo) − burden·i, and its derivative.
func (s *Sim) loop(i float64, way int8, vs float64) (u, du float64) {
	b := &s.b
	burden := b.Load.Burden
	if b.Driver.Stage == StageNone {
		u, du = s.pinLoop(i, way, vs)
		return u - burden*i, du - burden
	}
	switch {
	case way < 0 && b.Driver.Body == nil:
		return blocked, 0
	case way < 0 && !(s.driven && b.Driver.Stage == NMOS):
		d, r := s.body.drop(-i)
		return vs + d - burden*i, -r - burden
	case s.driven:
		d, r := s.saturation(i)
		return vs - d - burden*i, -r - burden
	case b.Flyback != nil:
		d, r := s.flyback.drop(i)
		return -d - burden*i, -r - burden
	}
	return vs - b.Driver.Breakdown - burden*i, -burden
}

// pinLoop is loop for a load on the timer's output itself.
func (s *Sim) pinLoop(i float64, way int8, vs float64) (u, du float64) {
	toSupply := s.b.Load.ToSupply
	if way > 0 && s.b.Flyback != nil && s.high == toSupply {
		d, r := s.flyback.drop(i)
		return -d, -r
	}
	out := i // sourced by the pin
	if toSupply {
		out = -i
	}
	if out == 0 { // the limit from the side the current would flow
		out = float64(way) * 1e-12
		if toSupply {
			out = -out
		}
	}
	if toSupply {
		v, r := s.pin(out, vs)
		return vs - v, r
	}
	return s.pin(out, vs)
}

// saturation gives the conducting switch's drop at load current i and its
// slope. Short of base current the drop rises steeply above gain × base.
func (s *Sim) saturation(i float64) (v, r float64) {
	d := &s.b.Driver
	r = s.on
	v = d.Saturation + r*i
	if d.Gain > 0 {
		if over := i - d.Gain*s.base; over > 0 {
			const early = 1e3 // ohm; steep against any load
			v += early * over
			r += early
		}
	}
	return v, r
}

// drive sets what the timer's output does to the switch: base current and
// on-resistance at supply vs.
func (s *Sim) drive(vs float64) {
	d := &s.b.Driver
	s.on, s.base = d.Resistance, 0
	if d.Stage == StageNone {
		return
	}
	v, i := s.output(vs, 0, s.net.fed)
	s.base = i - s.net.fed
	if d.Stage == NMOS && d.GateLevel > 0 && v < d.RatedGate {
		s.on *= (d.RatedGate - d.GateLevel) / math.Max(v-d.GateLevel, 0.02)
	}
}

// resistorCurrent is the current of a load without inductance.
func (s *Sim) resistorCurrent(vs float64) float64 {
	d, l := &s.b.Driver, &s.b.Load
	if d.Stage == StageNone {
		_, i := s.output(vs, 0, s.net.fed)
		if i -= s.net.fed; l.ToSupply {
			return -i
		}
		return i
	}
	if !s.driven {
		return 0
	}
	i := math.Max(0, (vs-d.Saturation)/(l.Resistance+l.Burden+s.on))
	if d.Gain > 0 {
		i = math.Min(i, d.Gain*s.base)
	}
	return i
}

// copper is the temperature coefficient of resistance of copper, 1/K, at 20
// to 27 °C (handbook value 0.00393 at 20 °C).
const copper = 0.0039

func (s *Sim) winding() float64 {
	return s.b.Load.Resistance * (1 + copper*(s.x.Winding-Nominal))
}

// constant is K at a rotor angle: the mean with its commutation ripple.
func (s *Sim) constant(angle float64) float64 {
	l := &s.b.Load
	if l.Ripple == 0 || s.smooth {
		return l.Constant
	}
	return l.Constant * (1 + l.Ripple*math.Cos(l.RipplePerTurn*angle))
}

// drag is the torque against a turning rotor, N m.
func (s *Sim) drag(speed, angle float64) float64 {
	l := &s.b.Load
	t := l.CoulombTorque + speed*(l.ViscousTorque+speed*l.QuadraticTorque)
	if l.Cogging != 0 && !s.smooth {
		t += l.Cogging * math.Sin(l.CoggingPerTurn*angle)
	}
	return t
}

// unevenness is how many times a turn the rotor feels a difference.
func (s *Sim) unevenness() (perTurn float64) {
	l := &s.b.Load
	if s.smooth || l.Kind != Motor {
		return 0
	}
	if l.Cogging != 0 {
		perTurn = l.CoggingPerTurn
	}
	if l.Ripple != 0 {
		perTurn = math.Max(perTurn, l.RipplePerTurn)
	}
	return perTurn
}

// flywheel tells whether the rotor has so much energy that cogging does not
// show in its mean speed: a tooth's work is below a hundredth of it.
func (s *Sim) flywheel() bool {
	l := &s.b.Load
	if l.Kind != Motor || !s.turning {
		return false
	}
	tooth := 2 * l.Cogging / math.Max(l.CoggingPerTurn, 1)
	return l.Inertia*s.x.Speed*s.x.Speed/2 > 100*tooth
}

// mechanical is the rotor's time constant at a speed, s: J/(K²/R + B + 2Qω).
func (l *Load) mechanical(speed, resistance float64) float64 {
	return l.Inertia / (l.Constant*l.Constant/resistance + l.ViscousTorque + 2*l.QuadraticTorque*speed)
}
