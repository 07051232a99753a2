package practice

import (
	"context"
	"strconv"

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
}

func newPot(w *world, part Pot) *pot {
	p := &pot{Device: scpi.NewDevice("Nightbench,practice-pot,PB-1,1.0", 8), world: w, part: part}
	p.Reset = func() { p.write(part.Codes / 2) }
	p.Set("WIPer", func(c *scpi.Call) error { p.write(c.Int(0)); return nil }, scpi.Numeric{Max: float64(part.Codes - 1), Integer: true})
	p.Get("WIPer", func(c *scpi.Call) (string, error) {
		if c.Word(0) != "" {
			return strconv.Itoa(part.Codes - 1), nil
		}
		return strconv.Itoa(p.code), nil
	}, scpi.Choice{Words: []string{"MAXimum"}, Optional: true})
	p.Get("WIPer:POWer", func(*scpi.Call) (string, error) { return "1", nil })
	p.write(part.Start)
	return p
}

func (p *pot) instrument() *Instrument {
	return &Instrument{answer: func(ctx context.Context, message []byte) []byte {
		if p.world.clock.Sleep(ctx, seconds(potAnswer)) != nil {
			return nil
		}
		return p.Execute(ctx, message)
	}}
}

// write moves the wiper of the part: R = track·D/(codes − 1) + wiper.
func (p *pot) write(code int) {
	p.code = code
	ohms := p.part.Track*float64(code)/float64(p.part.Codes-1) + p.part.Wiper
	p.world.do(func(s *circuit.Sim) {
		if err := s.SetPot(ohms); err != nil {
			p.Push(err)
		}
	})
}
