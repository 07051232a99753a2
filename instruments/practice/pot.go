package practice

import (
	"context"
	"strconv"
	"sync/atomic"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// potAnswer is the time the bridge takes for a message, s.
const potAnswer = 1e-3

// pot is a digital potentiometer behind the bridge of the nightbench-pot dialect.
type pot struct {
	*scpi.Device
	world *world
	part  Pot
	code  int
	power int         // how often it was powered on
	stuck atomic.Bool // the wiper stays where it is
}

func newPot(w *world, part Pot) *pot {
	p := &pot{Device: scpi.NewDevice("Nightbench,practice-pot,PB-1,1.0", 8), world: w, part: part, power: 1}
	p.Reset = func() { p.write(part.Codes / 2) }
	p.Set("WIPer", func(c *scpi.Call) error { p.write(c.Int(0)); return nil }, scpi.Numeric{Max: float64(part.Codes - 1), Integer: true})
	p.Get("WIPer", func(c *scpi.Call) (string, error) {
		if c.Word(0) != "" {
			return strconv.Itoa(part.Codes - 1), nil
		}
		return strconv.Itoa(p.code), nil
	}, scpi.Choice{Words: []string{"MAXimum"}, Optional: true})
	p.Get("WIPer:POWer", func(*scpi.Call) (string, error) { return strconv.Itoa(p.power), nil })
	p.write(part.Start)
	return p
}

func (p *pot) instrument() *Instrument {
	return &Instrument{device: p.Device, again: p.restart, mains: p.mains, own: map[Kind]func() func(){StuckWiper: p.stick}, answer: func(ctx context.Context, message []byte) []byte {
		if p.world.clock.Sleep(ctx, seconds(potAnswer)) != nil {
			return nil
		}
		return p.Execute(ctx, message)
	}}
}

// restart is a power-on: the part is at its middle code, and the bridge counts.
func (p *pot) restart() {
	p.power++
	p.code = p.part.Codes / 2
}

// mains coming back puts the part at its middle code at once.
func (p *pot) mains(on bool) {
	if on && !p.stuck.Load() {
		p.turn(p.part.Codes / 2)
	}
}

// stick holds the wiper; let go, it goes with the next code.
func (p *pot) stick() (lift func()) {
	p.stuck.Store(true)
	return func() { p.stuck.Store(false) }
}

// write moves the wiper of the part: R = track·D/(codes − 1) + wiper, counted from
// terminal B. In a wiper network the rest of the track charges, and the wiper's own
// resistance is the board's.
func (p *pot) write(code int) {
	if p.code = code; p.stuck.Load() {
		return
	}
	p.turn(code)
}

func (p *pot) turn(code int) {
	share := float64(code) / float64(p.part.Codes-1)
	p.world.do(func(s *circuit.Sim) {
		ohms := p.part.Track*share + p.part.Wiper
		if t := s.Board().Timing; t.Pot == circuit.PotWiper {
			ohms = t.PotTrack * (1 - share)
		}
		must(s.SetPot(ohms))
	})
}
