package circuit

import "math"

// pin gives the output pin's voltage when it sources i (negative: sinks), and
// the slope in ohms. Current the transistors can't carry goes through the
// clamp, beyond the rail.
func (s *Sim) pin(i, vs float64) (v, r float64) {
	m := &s.b.Timer
	switch {
	case s.powered && s.high && i >= 0:
		d, rd := m.Drop.at(i, vs)
		d += m.DropPerKelvin * (s.ambient - Nominal)
		if vs-d < 0 {
			return 0, 0
		}
		return vs - d, -rd
	case s.powered && !s.high && i <= 0:
		d, rd := m.Low.at(-i, vs)
		return math.Min(d, vs), -rd
	}
	if i == 0 {
		return 0, 0 // dead, and nothing pulls at it
	}
	over, r := s.clamp.drop(math.Abs(i))
	if m.PushPull && s.powered {
		d, rd := m.Drop.at(-i, vs)
		if !s.high {
			d, rd = m.Low.at(i, vs)
		}
		if d < over {
			over, r = d, rd
		}
	}
	if i > 0 {
		return -over, -r
	}
	return vs + over, -r
}

// output solves the pin's voltage and current together with what hangs on it:
// the base resistor or a resistive load as a line, and fixed currents (the
// motor's, the output-fed network's) in extra.
func (s *Sim) output(vs, load, extra float64) (v, i float64) {
	g, j := s.hung(vs)
	if s.b.Driver.Stage == StageNone && s.b.Load.Kind == Motor {
		if s.b.Load.ToSupply {
			load = -load
		}
		extra += load
	}
	switch {
	case !s.powered && extra == 0: // dead: the pin goes where its load leaves it
		if s.b.Driver.Stage == StageNone && g > 0 {
			return -j / g, 0
		}
		return 0, 0
	case g == 0 || !s.powered:
		v, _ = s.pin(extra, vs)
		return v, extra
	}
	i = extra
	for range 12 {
		p, r := s.pin(i, vs)
		v = (p - r*i + r*(j+extra)) / (1 - r*g)
		next := g*v + j
		if s.b.Driver.Stage != StageNone && next < 0 {
			next = 0
		}
		next += extra
		if math.Abs(next-i) < 1e-10 {
			i = next
			break
		}
		i = next
	}
	v, _ = s.pin(i, vs)
	return v, i
}

// hung gives the line i = g v + j of what hangs on the output pin.
func (s *Sim) hung(vs float64) (g, j float64) {
	d, l := &s.b.Driver, &s.b.Load
	switch {
	case d.Stage == NPN || d.Stage == Darlington:
		g = 1 / d.BaseResistor
		return g, -g * d.Vbe
	case d.Stage == StageNone && l.Kind == Resistor:
		g = 1 / (l.Resistance + l.Burden)
		if l.ToSupply {
			return g, -g * vs
		}
		return g, 0
	}
	return 0, 0
}
