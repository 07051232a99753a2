package circuit

// A Point is one row of an output table.
type Point struct{ Amps, Volts float64 }

// A Curve is an output's drop or low level against current at one supply
// voltage, by ascending current.
type Curve struct {
	Supply float64 // V
	Points []Point
}

// Levels are curves by ascending supply voltage. Straight lines join the
// points in current and the curves in supply; beyond the last point the last
// line goes on, beyond the outer curves the nearest one holds.
type Levels []Curve

// at gives volts and the slope in ohms at a current and supply.
func (l Levels) at(i, supply float64) (v, r float64) {
	switch n := len(l); {
	case n == 0:
		return 0, 0
	case n == 1 || supply <= l[0].Supply:
		return l[0].at(i)
	case supply >= l[n-1].Supply:
		return l[n-1].at(i)
	}
	k := 1
	for supply > l[k].Supply {
		k++
	}
	w := (supply - l[k-1].Supply) / (l[k].Supply - l[k-1].Supply)
	v0, r0 := l[k-1].at(i)
	v1, r1 := l[k].at(i)
	return v0 + w*(v1-v0), r0 + w*(r1-r0)
}

func (c *Curve) at(i float64) (v, r float64) {
	p := c.Points
	if len(p) == 1 {
		return p[0].Volts, 0
	}
	k := 1
	for k < len(p)-1 && i > p[k].Amps {
		k++
	}
	r = (p[k].Volts - p[k-1].Volts) / (p[k].Amps - p[k-1].Amps)
	return p[k-1].Volts + r*(i-p[k-1].Amps), r
}

// A Quiescent is the timer's own supply current at one supply voltage.
type Quiescent struct{ Volts, Amps float64 }

// quiescent gives the current at a supply by straight lines from the origin
// through the points; the last line goes on.
func quiescent(q []Quiescent, supply float64) float64 {
	if len(q) == 0 || supply <= 0 {
		return 0
	}
	if supply <= q[0].Volts || len(q) == 1 {
		return q[0].Amps * supply / q[0].Volts
	}
	k := 1
	for k < len(q)-1 && supply > q[k].Volts {
		k++
	}
	return q[k-1].Amps + (q[k].Amps-q[k-1].Amps)*(supply-q[k-1].Volts)/(q[k].Volts-q[k-1].Volts)
}
