package circuit

import "math"

// A network is the timing network as the capacitor sees it: a source of
// voltage vth behind rth at node W, and two branches between W and the
// capacitor X, `up` pointing to X and `down` pointing away from it. Every
// kind of network in Timing is a case of this one.
type network struct {
	up, down branch
	rw       float64 // wiper resistance, part of rth between the pin and W

	// of the last solution
	w, source float64 // node W, V; current from the source into W, A
	fed       float64 // what of it the timer's output supplies, A
}

// build sets the branches for pot ohms p and temperature t.
func (n *network) build(b *Timing, p, t float64) {
	up, down := b.Up, b.Down
	n.rw = 0
	switch b.Pot {
	case PotUp:
		up += p
	case PotDown:
		down += p
	case PotWiper:
		up += p
		down += b.PotTrack - p
		n.rw = b.PotWiperOhms
	}
	switch b.Network {
	case Plain:
		n.up.kind = open
		n.down.set(nil, down, t)
	case Bypassed:
		n.up.set(b.ChargeDiode, up, t)
		n.down.set(nil, down, t)
	case OutputFed:
		if b.ChargeDiode == nil && b.DischargeDiode == nil {
			n.up.kind = open
			n.down.set(nil, down, t)
			return
		}
		fallthrough
	default:
		n.up.set(b.ChargeDiode, up, t)
		n.down.set(b.DischargeDiode, down, t)
	}
}

// solve finds the node voltages for a source vth behind rth and capacitor
// voltage v by Newton's method, and returns the current into the capacitor
// and its derivative against v.
func (n *network) solve(vth, rth, v float64) (i, di float64) {
	rth = math.Max(rth+n.rw, wiring)
	gs := 1 / rth
	for range 200 {
		a1, g1 := n.up.linear()
		a2, g2 := n.down.linear()
		g := g1 + g2
		n.w = (vth*gs - a1 + a2 + g*v) / (gs + g)
		d := n.w - v
		i = a1 + g1*d - a2 + g2*d
		di = -gs * g / (gs + g)
		if math.Max(n.up.move(d), n.down.move(-d)) < 1e-4 {
			break // i, linear in the last move, is good to its square
		}
	}
	n.source = (vth - n.w) * gs
	return i, di
}

// pin gives the voltage at the network's own pin, before the wiper resistance.
func (n *network) pin() float64 { return n.w + n.source*n.rw }
