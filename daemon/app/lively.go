package app

import (
	"fmt"
	"maps"
	"math/rand/v2"
	"slices"
	"strings"

	"nightbench/instruments/practice"
	"nightbench/instruments/practice/circuit"
)

// substitute fits another part in place of what the specimen would have.
func (s *specimen) substitute(x Substitute) error {
	if x.Fitted != "" {
		return s.fit(x.Part, x.Fitted)
	}
	old, ok := s.value[x.Part]
	if !ok {
		return fmt.Errorf("substitute: this board has no part %q; it has %s", x.Part, strings.Join(slices.Sorted(maps.Keys(s.value)), ", "))
	}
	if x.Value > 0 {
		s.value[x.Part] = x.Value
	} else {
		s.value[x.Part] = old * x.Times
	}
	return nil
}

// fit puts a diode of the catalogue in the place of another.
func (s *specimen) fit(place, name string) error {
	if _, ok := s.value[place+".is"]; !ok {
		return fmt.Errorf("substitute: this board has no diode %q; only diodes are named by a part of the catalogue", place)
	}
	var names []string
	for _, d := range s.parts.Diodes {
		names = append(names, d.Name)
		if d.Name != name {
			continue
		}
		s.value[place+".is"], s.value[place+".n"], s.value[place+".rs"], s.value[place+".shunt"] = d.Is.Typical, d.N.Typical, d.Rs.Typical, d.Shunt.Typical
		s.fitted[place] = name
		return nil
	}
	return fmt.Errorf("substitute: %q is no diode of the catalogue; there are %s", name, strings.Join(names, ", "))
}

// enliven gives a motor what no board file states: cogging and commutation ripple of a
// small three-pole motor, and a winding that warms. Common practice, no source: cogging
// a third of the friction, six commutations a turn, 15 K/W and 8 J/K for a motor of 30 g.
// A nominal specimen (seed 0) has none of it: it is what the schematic says.
func (s *specimen) enliven(l *circuit.Load) {
	if s.seed == 0 || l.Kind != circuit.Motor {
		return
	}
	r := rand.New(rand.NewPCG(s.seed, 556))
	about := func(x float64) float64 { return x * (0.8 + 0.4*r.Float64()) }
	l.Cogging, l.CoggingPerTurn = about(l.CoulombTorque/3), 6
	l.Ripple, l.RipplePerTurn = about(0.005), 6
	l.ThermalResistance, l.ThermalCapacity = about(15), about(8)
}

// climate is the room of a specimen's night: it cools by about two kelvin until the
// small hours, while the board warms itself by a few. Film capacitors change by some
// −200 ppm/K (common practice, no source). A nominal specimen stands at 27 °C.
func (s *specimen) climate() practice.Climate {
	if s.seed == 0 {
		return practice.Climate{}
	}
	r := rand.New(rand.NewPCG(s.seed, 557))
	about := func(x float64) float64 { return x * (0.8 + 0.4*r.Float64()) }
	return practice.Climate{Room: 295.15 + 2*r.Float64(), Swing: -about(2), Night: 57600, Rise: about(5), Tau: about(600), CapacitorPerKelvin: -about(200e-6)}
}
