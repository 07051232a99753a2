package drivertest

import (
	"strconv"
	"sync"

	"nightbench/instruments/scpi"
)

// Pot is a bridge in front of a part of 257 positions.
type Pot struct {
	Listener
	Stuck bool // the part keeps its code
	Deaf  bool // the part does not answer the bridge

	mu       sync.Mutex // guards what follows
	code     int
	powerOns int
}

// NewPot makes a bridge that has just been switched on.
func NewPot() *Pot {
	p := &Pot{}
	d := scpi.NewDevice("Nightbench,pot-bridge,T4,1.0 part-257", 8)
	d.Status.TakeEvents()
	p.Device = d
	p.PowerOn()
	d.Set("WIPer", p.write, scpi.Numeric{Max: 256})
	d.Get("WIPer", p.read, scpi.Choice{Words: []string{"MAXimum"}, Optional: true})
	d.Get("WIPer:POWer", func(*scpi.Call) (string, error) {
		p.mu.Lock()
		defer p.mu.Unlock()
		return strconv.Itoa(p.powerOns), nil
	})
	return p
}

// PowerOn puts the wiper in the middle and counts.
func (p *Pot) PowerOn() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.code = 128
	p.powerOns++
}

func (p *Pot) write(c *scpi.Call) error {
	p.mu.Lock()
	defer p.mu.Unlock()
	switch {
	case p.Deaf:
		return scpi.NewFault(-240, "no answer from the part")
	case !p.Stuck:
		p.code = int(c.Number(0))
	}
	return nil
}

func (p *Pot) read(c *scpi.Call) (string, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	switch {
	case c.Has(0):
		return "256", nil
	case p.Deaf:
		p.Device.Push(scpi.NewFault(-240, "no answer from the part"))
		return "-1", nil
	}
	return strconv.Itoa(p.code), nil
}
