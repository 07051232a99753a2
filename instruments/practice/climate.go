package practice

import (
	"math"

	"nightbench/instruments/practice/circuit"
)

// Climate is the temperature of the board through the night, and what it does to the
// timing capacitor. Diodes, timer and winding follow by themselves. The zero Climate
// leaves the board at its own ambient.
type Climate struct {
	Room  float64 // K at the start; 0: the board's ambient, and nothing changes
	Swing float64 // K by which the room has cooled (below 0) or warmed half a Night later
	Night float64 // s of a whole swing there and back; 0: 24 h
	Rise  float64 // K by which the energised board warms itself
	Tau   float64 // s of that warming; 0: 600

	CapacitorPerKelvin float64 // share by which the capacitance changes
}

// climateEvery is how often the temperature is looked at, s; changes below climateStep (K) wait.
const (
	climateEvery = 20.0
	climateStep  = 0.02
)

// weather keeps the board at its climate.
type weather struct {
	Climate
	warm  float64 // K of own warming so far
	at    float64 // K the board stands at
	share float64 // of the capacitance taken on so far
}

func (w *world) expose(c Climate) {
	if c.Room == 0 {
		return
	}
	if c.Night == 0 {
		c.Night = 86400
	}
	if c.Tau == 0 {
		c.Tau = 600
	}
	x := &weather{Climate: c, share: 1}
	w.do(func(s *circuit.Sim) { x.settle(s, 0) })
	w.every(climateEvery, x.settle)
}

// settle takes the board to the temperature of the moment, a span (s) after the last look.
func (x *weather) settle(s *circuit.Sim, span float64) {
	goal := 0.0
	if s.State().Supply > 2 {
		goal = x.Rise
	}
	x.warm += (goal - x.warm) * -math.Expm1(-span/x.Tau)
	kelvin := x.Room + x.Swing*(1-math.Cos(2*math.Pi*s.Now()/x.Night))/2 + x.warm
	if math.Abs(kelvin-x.at) < climateStep {
		return
	}
	x.at = kelvin
	must(s.SetAmbient(kelvin))
	share := 1 + x.CapacitorPerKelvin*(kelvin-circuit.Nominal)
	must(s.Change(func(b *circuit.Board) { b.Timing.Capacitance *= share / x.share }))
	x.share = share
}
