package derive

import (
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/uncertainty"
)

// road is one way to a quantity: its budget, or flags that say why it has no value.
type road struct {
	name   string
	budget uncertainty.Budget
	ok     bool
	flags  []sweeps.Flag
	raw    []string

	channel bool    // it came by a scope channel
	below   bool    // the probe saw a level well below common
	pivot   float64 // V, from which it is counted down to what the probe saw; 0: the probe saw it itself
}

// Readings are the wanted quantities in the order wanted.
func Readings(w instruments.Wiring, board sweeps.Board, raw Raw, wanted []sweeps.Quantity) []sweeps.Reading {
	d := &deriver{wiring: w, board: board, raw: raw}
	d.analyse()
	readings := make([]sweeps.Reading, 0, len(wanted))
	for _, q := range wanted {
		readings = append(readings, reading(q, d.roads(q)))
	}
	return readings
}

// deriver holds what several quantities share.
type deriver struct {
	wiring instruments.Wiring
	board  sweeps.Board
	raw    Raw
	timer  view // timer_out
	load   view // across the load
}

// roads are the ways this bench has to a quantity, the preferred one first.
func (d *deriver) roads(q sweeps.Quantity) []road {
	switch q {
	case sweeps.AverageVoltage:
		return append(d.metered(q), d.loadLevel(q))
	case sweeps.MotorCurrent, sweeps.OutputCurrent, sweeps.ControlVoltage:
		return d.metered(q)
	case sweeps.SupplyVoltage, sweeps.SupplyCurrent, sweeps.SupplyPower:
		return []road{d.supplied(q)}
	case sweeps.OutputDrop:
		return d.drops()
	case sweeps.PotResistance:
		return []road{d.pot()}
	case sweeps.BackEMF:
		return []road{d.loadLevel(q)}
	case sweeps.Conduction:
		return []road{d.load.road(q)}
	}
	return []road{d.timer.road(q)}
}

// disagree is how many standard uncertainties of their difference two roads may
// lie apart: 3 is passed by one pair in 370 by chance.
const disagree = 3

// reading takes the road with the least uncertainty and compares the others with it.
func reading(q sweeps.Quantity, roads []road) sweeps.Reading {
	best := -1
	for i, r := range roads {
		if r.ok && (best < 0 || r.budget.U() < roads[best].budget.U()) {
			best = i
		}
	}
	if best < 0 {
		return lost(q, roads)
	}
	b := roads[best]
	out := sweeps.Measured(q, b.budget.X, b.budget.U(), b.budget.DOF(), b.name)
	out.Flags, out.Raw = append(out.Flags, b.flags...), b.raw
	for i, r := range roads {
		if i != best && r.ok && uncertainty.Disagreement(b.budget, r.budget) > disagree {
			out.Flags = append(out.Flags, apart(b, r))
		}
	}
	return out
}

// lost is a reading without a value: what the roads say, or that there is none.
func lost(q sweeps.Quantity, roads []road) sweeps.Reading {
	r := sweeps.Reading{Quantity: q, Unit: q.Unit(), Flags: []sweeps.Flag{}}
	for _, x := range roads {
		r.Flags, r.Raw = append(r.Flags, x.flags...), append(r.Raw, x.raw...)
		if r.Road == "" {
			r.Road = x.name
		}
	}
	if len(r.Flags) == 0 {
		r.Flags = append(r.Flags, sweeps.Flag{Name: "no road", Words: fmt.Sprintf("no instrument of this bench gives %s", q)})
	}
	return r
}

// apart says that two roads disagree, and the likely cause by its signature at the
// probe: what is seen against the supply is turned back to what the probe saw.
func apart(a, b road) sweeps.Flag {
	words := fmt.Sprintf("%s and %s differ by %.1f u", a.name, b.name, uncertainty.Disagreement(a.budget, b.budget))
	scope, other := a, b
	if b.channel {
		scope, other = b, a
	}
	saw, should := math.Abs(scope.pivot-scope.budget.X), math.Abs(scope.pivot-other.budget.X)
	switch {
	case !scope.channel:
		words += "; a range, or a wrong connection, is likely"
	case near(saw/should, 10) || near(saw/should, 0.1):
		words += fmt.Sprintf("; what the probe saw is %.2g times what it should be: a probe factor is likely", saw/should)
	case scope.below || saw < 0.05*should:
		words += "; the scope sees no mean, or less than common: AC coupling is likely"
	default:
		words += "; aperture against period, or a range, is likely"
	}
	return sweeps.Flag{Name: "roads disagree", Words: words}
}

func near(x, y float64) bool { return math.Abs(x/y-1) < 0.15 }

// pot is the resistance of the code read back, with the tolerance of the track; with
// the wiper in the timing network that of the track's charging share.
func (d *deriver) pot() road {
	p := d.wiring.Pot
	if p == nil {
		return road{name: "pot", flags: []sweeps.Flag{{Name: "no road", Words: "this bench has no pot"}}}
	}
	ohms := p.Ohms(d.raw.Setpoint.PotCode).SI()
	track := ohms - p.Wiper
	if d.board.Timing.Track.Pot {
		track = p.EndToEnd * p.Position(d.raw.Setpoint.PotCode)
		ohms = track
	}
	b := uncertainty.New(ohms, uncertainty.Rectangular("track tolerance", p.Tolerance*track).Keyed("pot track"))
	return road{name: "pot code read back", budget: b, ok: true}
}
