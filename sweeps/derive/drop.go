package derive

import (
	"math"
	"slices"

	"nightbench/sweeps"
	"nightbench/sweeps/pulse"
	"nightbench/sweeps/uncertainty"
)

// drops are the roads to the output drop: supply less load voltage in the driven
// phase. Where both are there and agree, their weighted mean comes first: the
// scope's zero enters them with opposite signs and largely cancels.
func (d *deriver) drops() []road {
	direct, average := d.directDrop(), d.averageDrop()
	if !direct.ok || !average.ok || uncertainty.Disagreement(direct.budget, average.budget) > disagree {
		return []road{average, direct}
	}
	both := road{name: average.name + " with " + direct.name, ok: true, raw: average.raw, budget: uncertainty.Mean(direct.budget, average.budget)}
	both.flags = slices.Concat(direct.flags, average.flags)
	return []road{both, average, direct}
}

// directDrop reads the driven level on the scope. Seen against the supply the
// supply's own error cancels: what is left is the level of the switched node.
func (d *deriver) directDrop() road {
	r := d.load.road(sweeps.HighLevel)
	if !r.ok {
		return r
	}
	r.name += ", driven level"
	r.pivot, r.channel = 0, true
	if d.against() {
		vs := d.raw.SupplyVoltage()
		r.budget = uncertainty.Linear([]float64{-1}, r.budget)
		r.budget.X += vs
		return d.withBurden(r)
	}
	// The node is seen from common: here the supply's error stays.
	s := d.supplied(sweeps.SupplyVoltage)
	if !s.ok {
		return road{name: r.name, flags: s.flags, raw: s.raw}
	}
	r.budget = uncertainty.Difference(s.budget, r.budget)
	return r
}

// against tells whether the load is seen as the voltage from the supply down to the probe.
func (d *deriver) against() bool { return d.lowSide() || d.board.Load.ToSupply }

// loadLevel is the scope's road to a voltage across the load. Seen against the supply it has the supply's error too.
func (d *deriver) loadLevel(q sweeps.Quantity) road {
	r := d.load.road(q)
	r.channel, r.below = true, d.belowCommon()
	if !r.ok || !d.against() {
		return r
	}
	s := d.supplied(sweeps.SupplyVoltage)
	if !s.ok {
		return road{name: r.name, flags: s.flags, raw: s.raw}
	}
	r.pivot = s.budget.X
	r.budget = r.budget.Add(s.budget.Components...)
	return r
}

// belowCommon tells whether a channel saw a level no node of the board has: more
// than a twentieth of the supply below common.
func (d *deriver) belowCommon() bool {
	vs := d.raw.SupplyVoltage()
	if d.against() {
		high, ok := d.load.get(sweeps.HighLevel)
		return ok && high.X > 1.05*vs
	}
	low, ok := d.load.get(sweeps.LowLevel)
	return ok && low.X < -0.05*vs
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
