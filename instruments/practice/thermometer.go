package practice

import (
	"context"
	"math/rand/v2"
	"strconv"

	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/scpi"
)

// Figures of the thermometer, those of the usual one-wire sensor (from memory).
const (
	probeError      = 0.5  // K, limit
	probeStep       = 0.01 // K as told; the sensor's own is 1/16
	probeConversion = 0.75 // s
	probeNoise      = 0.02 // K rms
	iceKelvin       = 273.15
)

// thermometer is the serial thermometer of the nightbench-probe dialect, on the board.
type thermometer struct {
	*scpi.Device
	world *world
	rng   *rand.Rand
	off   float64 // K, its own error
}

func newThermometer(w *world, r *rand.Rand) *thermometer {
	p := &thermometer{Device: scpi.NewDevice("Nightbench,practice-probe,TP-1,1.0", 8), world: w, rng: r, off: probeError * (2*r.Float64() - 1) / 2}
	p.Get("TEMPerature", func(c *scpi.Call) (string, error) {
		if err := p.world.clock.Sleep(c.Context, seconds(probeConversion)); err != nil {
			return "", err
		}
		var kelvin float64
		p.world.do(func(s *circuit.Sim) { kelvin = s.Board().Ambient })
		celsius := quantise(kelvin-iceKelvin+p.off+p.rng.NormFloat64()*probeNoise, 1./16)
		return strconv.FormatFloat(quantise(celsius, probeStep), 'f', 2, 64), nil
	})
	return p
}

func (p *thermometer) instrument() *Instrument {
	return &Instrument{device: p.Device, answer: func(ctx context.Context, message []byte) []byte {
		if p.world.clock.Sleep(ctx, seconds(relayAnswer)) != nil {
			return nil
		}
		return p.Execute(ctx, message)
	}}
}
