package derive

import (
	"math"

	"nightbench/sweeps"
	"nightbench/sweeps/pulse"
	"nightbench/sweeps/uncertainty"
)

// drops are the roads to the output drop: supply less load voltage in the driven phase.
func (d *deriver) drops() []road {
	return []road{d.directDrop(), d.averageDrop()}
}

// directDrop reads the driven level on the scope. Seen against the supply the
// supply's own error cancels: what is left is the level of the switched node.
func (d *deriver) directDrop() road {
	r := d.load.road(sweeps.HighLevel)
	if !r.ok {
		return r
	}
	vs := d.raw.SupplyVoltage()
	r.name += ", driven level"
	r.budget = uncertainty.Linear([]float64{-1}, r.budget)
	r.budget.X += vs
	if d.lowSide() || d.board.Load.ToSupply {
		return d.withBurden(r)
	}
	// The node is seen from common: here the supply's error stays.
	if s := d.supplied(sweeps.SupplyVoltage); s.ok {
		r.budget = r.budget.Add(uncertainty.Known("supply voltage", s.budget.U()).Keyed("supply voltage"))
	}
	return r
}

// lowSide tells whether a transistor switches the load's low side, so that the load is seen against the supply.
func (d *deriver) lowSide() bool { return d.board.Driver.Stage != sweeps.StageNone }

// withBurden adds what stands across the current meter in the driven phase: about the
// mean motor current times its burden, known no better than its own size.
func (d *deriver) withBurden(r road) road {
	for i, m := range d.wiring.Meters {
		if sweeps.Quantity(m.Reads) != sweeps.MotorCurrent || m.Burden <= 0 || i >= len(d.raw.Meters) {
			continue
		}
		if s := samples("meter "+m.Name, d.raw.Meters[i], m.Accuracy); s.ok {
			across := m.Burden * math.Abs(s.budget.X)
			r.budget.X += across
			r.budget = r.budget.Add(uncertainty.Rectangular("burden of the current meter", across))
		}
	}
	return r
}

// averageDrop divides the meter's average by the scope's duty: V̄ = D·H + (1−D)·L.
// Two-level waves only: with a sagging top or a freewheeling motor it would lie.
func (d *deriver) averageDrop() road {
	r := road{name: "average ÷ duty"}
	meters := d.metered(sweeps.AverageVoltage)
	duty, ok := d.timer.get(sweeps.Duty)
	low, okLow := d.load.get(sweeps.LowLevel)
	if len(meters) == 0 || !meters[0].ok || !ok || !okLow || !(duty.X > 0) || d.lowSide() || d.board.Load.Kind == sweeps.Motor {
		return r
	}
	for _, res := range d.load.results {
		if res.Class != pulse.TwoLevel {
			return r
		}
	}
	supply := d.supplied(sweeps.SupplyVoltage)
	if !supply.ok {
		return r
	}
	r.budget = uncertainty.Propagate(func(x []float64) float64 {
		average, duty, low, supply := x[0], x[1], x[2], x[3]
		return supply - (average-(1-duty)*low)/duty
	}, meters[0].budget, duty, low, supply.budget)
	r.ok, r.raw = true, meters[0].raw
	return r
}
