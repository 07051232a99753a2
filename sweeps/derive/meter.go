package derive

import (
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/uncertainty"
)

// metered are the meters that read q, each a road.
func (d *deriver) metered(q sweeps.Quantity) []road {
	var roads []road
	for i, m := range d.wiring.Meters {
		if sweeps.Quantity(m.Reads) != q || i >= len(d.raw.Meters) {
			continue
		}
		r := samples("meter "+m.Name, d.raw.Meters[i], m.Accuracy)
		if r.ok && q == sweeps.AverageVoltage {
			r.budget = r.budget.Add(d.beating(d.raw.Meters[i])...)
		}
		if r.ok && m.InputResistance > 0 && q == sweeps.AverageVoltage {
			r.flags = append(r.flags, d.loading(m)...)
		}
		roads = append(roads, r)
	}
	return roads
}

// samples is the mean of repeated readings: scatter (type A), the maker's limit
// of error for the range in force (type B, rectangular: GUM 4.3.7), split into a
// part that grows with the reading and one that doesn't, and the resolution.
// Gain and zero are keyed by instrument, so that they cancel where they should.
func samples(name string, all []instruments.Sample, override *instruments.Accuracy) road {
	r := road{name: name}
	var values []float64
	for _, s := range all {
		r.raw = append(r.raw, s.Raw)
		if s.Outcome != instruments.Measured {
			r.flags = append(r.flags, refused(name, s))
			return r
		}
		values = append(values, s.Value)
	}
	if len(values) == 0 {
		r.flags = append(r.flags, sweeps.Flag{Name: "no reading", Words: name + " gave no reading"})
		return r
	}
	acc, rng := all[0].Accuracy, all[0].Range
	if override != nil {
		resolution := acc.Resolution
		acc = *override
		if acc.Resolution == 0 {
			acc.Resolution = resolution
		}
	}
	r.budget, r.ok = uncertainty.New(values[0]), true
	if v, err := uncertainty.Repeats(values); err == nil {
		r.budget = uncertainty.New(v.X, uncertainty.Scatter("scatter of repeats", v))
	}
	r.budget = r.budget.Add(
		uncertainty.Rectangular("gain", acc.Reading*math.Abs(r.budget.X)).Keyed(name+" gain"),
		uncertainty.Rectangular("zero", acc.Range*rng+acc.Offset).Keyed(name+" zero"),
		uncertainty.Resolution("resolution", acc.Resolution),
	)
	return r
}

// refused is the flag of a reply that is no number to use.
func refused(name string, s instruments.Sample) sweeps.Flag {
	switch s.Outcome {
	case instruments.Overload:
		return sweeps.Flag{Name: "overload", Words: fmt.Sprintf("%s overloads its range of %s", name, si.Format(s.Range, s.Unit))}
	case instruments.NotANumber:
		return sweeps.Flag{Name: "not a number", Words: name + " answered that it has no number"}
	}
	return sweeps.Flag{Name: "no measurement", Words: name + " could not measure"}
}

// beating is the aperture term: a meter that averages over Ta, not in step with a
// wave of period T, is wrong by up to ΔV·D(1−D)·T/Ta. Repeats begin at random
// phases, so that the mean of n is that much better by √n.
func (d *deriver) beating(all []instruments.Sample) []uncertainty.Component {
	duty, ok1 := d.timer.get(sweeps.Duty)
	period, ok2 := d.timer.get(sweeps.Period)
	if !ok1 || !ok2 || len(all) == 0 || !(all[0].Aperture > 0) {
		return nil
	}
	half := d.raw.SupplyVoltage() * duty.X * (1 - duty.X) * period.X / all[0].Aperture
	return []uncertainty.Component{uncertainty.Rectangular("aperture against period", half/math.Sqrt(float64(len(all))))}
}

// loading flags a meter whose input resistance bends what it measures by more than a tenth of a percent.
func (d *deriver) loading(m instruments.MeterWiring) []sweeps.Flag {
	share := d.board.Load.Resistance.SI() / m.InputResistance
	if share < 1e-3 {
		return nil
	}
	return []sweeps.Flag{{Name: "meter loads", Words: fmt.Sprintf("the meter's %s loads the board by %.1f %%", si.Format(m.InputResistance, si.Ohm), 100*share)}}
}

// supplied is what the supply itself reads.
func (d *deriver) supplied(q sweeps.Quantity) road {
	var volts, amperes []instruments.Sample
	for _, s := range d.raw.Supply {
		volts, amperes = append(volts, s.Voltage), append(amperes, s.Current)
	}
	v, i := samples("supply voltage", volts, nil), samples("supply current", amperes, nil)
	switch {
	case q == sweeps.SupplyVoltage:
		return v
	case q == sweeps.SupplyCurrent:
		return i
	case !v.ok:
		return v
	case !i.ok:
		return i
	}
	// The supply's voltage is steady, so that its mean times the mean current is the mean power, chopped or not.
	p := uncertainty.Propagate(func(x []float64) float64 { return x[0] * x[1] }, v.budget, i.budget)
	return road{name: "supply voltage × current", budget: p, ok: true, raw: append(v.raw, i.raw...)}
}
