package predict

import (
	"math"

	"nightbench/sweeps"
)

// Curve computes the ensemble along the pot at one supply voltage and temperature
// (°C). Points at which the nominal board has no value are nil.
func (e *Ensemble) Curve(supply float64, pots []float64, temperature float64) sweeps.Curve {
	return e.CurveAt(Setting{Supply: supply, Temperature: temperature}, pots)
}

// CurveAt is Curve with all of a setting but the pot given, the burden too.
func (e *Ensemble) CurveAt(s Setting, pots []float64) sweeps.Curve {
	c := sweeps.Curve{Supply: s.Supply, Pot: append([]float64{}, pots...), Quantities: map[sweeps.Quantity]sweeps.CurveOfQuantity{}}
	rows := make([]row, len(e.draws))
	for k, pot := range pots {
		s.Pot = pot
		if e.m.checkSetting(s) != nil {
			continue
		}
		nominal := e.m.solve(&e.m.nominal, s.conditions())
		b := e.bands(s, &nominal, rows)
		for i, q := range predicted {
			if math.IsNaN(b.value[i]) {
				continue
			}
			line, ok := c.Quantities[q]
			if !ok {
				line = sweeps.CurveOfQuantity{Unit: q.Unit(), Value: make([]*float64, len(pots)), Low: make([]*float64, len(pots)), High: make([]*float64, len(pots))}
				c.Quantities[q] = line
			}
			v, lo, hi := b.value[i], b.low[i], b.high[i]
			line.Value[k], line.Low[k], line.High[k] = &v, &lo, &hi
		}
	}
	return c
}
