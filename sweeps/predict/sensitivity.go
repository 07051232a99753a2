package predict

import (
	"fmt"
	"math"

	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// Sensitivity is how a part moves every quantity at a setting: ∂ln(quantity)/∂ln(part),
// so 1 means that one percent of the part makes one percent of the quantity. Absent
// where the quantity, or the part, is zero or has no value.
type Sensitivity struct {
	Part   string                      `json:"part"`
	Unit   si.Unit                     `json:"unit"`
	Values map[sweeps.Quantity]float64 `json:"values"`
}

// nudge is the relative change for a central difference: its cube, the method's
// error, and the solver's 1e-9 over it are both below 1e-5.
const nudge = 1e-3

// Sensitivities differentiates the nominal board with respect to each part that
// varies, and to the supply voltage. The error is of a setting that cannot be, or
// at which the board does not oscillate.
func (m *Model) Sensitivities(s Setting) ([]Sensitivity, error) {
	if err := m.checkSetting(s); err != nil {
		return nil, fmt.Errorf("board %q: %w", m.board.Name, err)
	}
	c := s.conditions()
	nominal := m.solve(&m.nominal, c)
	if nominal.stop != oscillates {
		return nil, fmt.Errorf("board %q: %s", m.board.Name, m.flags(&nominal, s)[0].Words)
	}
	at := nominal.row()
	var out []Sensitivity
	for i := range m.variables {
		v := &m.variables[i]
		if v.typical == 0 {
			continue
		}
		out = append(out, Sensitivity{v.name, v.unit, slope(at, func(f float64) row {
			p := m.nominal
			*v.at(&p) *= f
			o := m.solve(&p, c)
			return o.row()
		})})
	}
	out = append(out, Sensitivity{"supply_voltage", si.Volt, slope(at, func(f float64) row {
		moved := c
		moved.supply *= f
		o := m.solve(&m.nominal, moved)
		return o.row()
	})})
	return out, nil
}

// slope is the central difference of a row in logarithms.
func slope(at row, with func(factor float64) row) map[sweeps.Quantity]float64 {
	up, down := with(1+nudge), with(1-nudge)
	out := map[sweeps.Quantity]float64{}
	for i, q := range predicted {
		if d := (up[i] - down[i]) / (2 * nudge * at[i]); !math.IsNaN(d) && !math.IsInf(d, 0) {
			out[q] = d
		}
	}
	return out
}
