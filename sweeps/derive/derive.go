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
		return append(d.metered(q), d.load.road(q))
	case sweeps.MotorCurrent, sweeps.OutputCurrent, sweeps.ControlVoltage:
		return d.metered(q)
	case sweeps.SupplyVoltage, sweeps.SupplyCurrent, sweeps.SupplyPower:
		return []road{d.supplied(q)}
	case sweeps.OutputDrop:
		return d.drops()
	case sweeps.PotResistance:
		return []road{d.pot()}
	case sweeps.BackEMF, sweeps.Conduction:
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
			out.Flags = append(out.Flags, apart(q, b, r))
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

// apart says that two roads disagree, and the likely cause by its signature.
func apart(q sweeps.Quantity, a, b road) sweeps.Flag {
	n := uncertainty.Disagreement(a.budget, b.budget)
	words := fmt.Sprintf("%s and %s differ by %.1f u", a.name, b.name, n)
	ratio := math.Abs(b.budget.X / a.budget.X)
	switch {
	case near(ratio, 10) || near(ratio, 0.1):
		words += "; their ratio is 10: a probe factor is likely"
	case math.Abs(b.budget.X) < 0.05*math.Abs(a.budget.X) && q == sweeps.AverageVoltage:
		words += "; the scope sees no mean: AC coupling is likely"
	default:
		words += "; aperture against period, or a range, is likely"
	}
	return sweeps.Flag{Name: "roads disagree", Words: words}
}

func near(x, y float64) bool { return math.Abs(x/y-1) < 0.15 }

// pot is the resistance of the code read back, with the tolerance of the track.
func (d *deriver) pot() road {
	p := d.wiring.Pot
	if p == nil {
		return road{name: "pot", flags: []sweeps.Flag{{Name: "no road", Words: "this bench has no pot"}}}
	}
	track := p.EndToEnd * float64(d.raw.Setpoint.PotCode) / float64(p.Codes-1)
	b := uncertainty.New(p.Ohms(d.raw.Setpoint.PotCode).SI(), uncertainty.Rectangular("track tolerance", p.Tolerance*track).Keyed("pot track"))
	return road{name: "pot code read back", budget: b, ok: true}
}
