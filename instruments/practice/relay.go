package practice

import (
	"context"
	"math"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// relayAnswer is the time the small serial devices take for a message, s.
const relayAnswer = 1e-3

// relay is the cutoff of the nightbench-relay dialect: a contact in the supply lead
// that opens unless it is fed.
type relay struct {
	*scpi.Device
	supply *supply
	timer  *tick
	hold   float64 // s, wall; guarded by the world's lock
}

func newRelay(s *supply) *relay {
	r := &relay{Device: scpi.NewDevice("Nightbench,practice-relay,CR-1,1.0", 8), supply: s}
	r.timer = s.world.timer(r.part)
	r.Reset = r.reset
	r.reset()
	r.Set("FEED", func(*scpi.Call) error { r.feed(); return nil })
	r.Set("OPEN", func(*scpi.Call) error { r.open(); return nil })
	r.Get("CLOSed", func(*scpi.Call) (string, error) {
		return scpi.Bit(ask(s, func() bool { return s.relay })), nil
	})
	r.Value("TIME", scpi.Numeric{Unit: "S", Min: 0.5, Max: 60, Default: 3},
		func(*scpi.Call) float64 { return ask(s, func() float64 { return r.hold }) },
		func(_ *scpi.Call, v float64) error {
			s.world.do(func(*circuit.Sim) { r.hold = quantise(v, 10e-3) })
			return nil
		})
	return r
}

func (r *relay) instrument() *Instrument {
	return &Instrument{device: r.Device, again: r.reset, mains: func(bool) { r.open() },
		answer: func(ctx context.Context, message []byte) []byte {
			if r.supply.world.clock.Sleep(ctx, seconds(relayAnswer)) != nil {
				return nil
			}
			return r.Execute(ctx, message)
		}}
}

func (r *relay) reset() {
	r.open()
	r.supply.world.do(func(*circuit.Sim) { r.hold = 3 })
}

// feed closes the contact and starts its time anew. The time is that of a link: not sped up.
func (r *relay) feed() {
	r.supply.world.do(func(sim *circuit.Sim) {
		r.timer.at = sim.Now() + r.supply.world.wall(r.hold)
		if !r.supply.relay {
			r.supply.relay = true
			r.supply.apply(sim)
		}
	})
}

func (r *relay) open() { r.supply.world.do(r.part) }

// part opens the contact. The world's lock is held.
func (r *relay) part(sim *circuit.Sim) {
	r.timer.at = math.Inf(1)
	r.supply.relay = false
	r.supply.apply(sim)
}
