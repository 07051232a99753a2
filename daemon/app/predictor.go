package app

import (
	"slices"

	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// draws is how many boards a band is drawn from, one a curve.
const draws = 1000

// predictor predicts for a run: at the bench's burden, with the pot's tolerance, always the same boards.
type predictor struct {
	board    sweeps.Board
	ensemble *predict.Ensemble
	burden   float64 // Ω in the motor's loop
}

// newPredictor draws the boards once; the seed is the run's.
func newPredictor(board sweeps.Board, w instruments.Wiring, seed uint64) (*predictor, error) {
	o := predict.Options{}
	if w.Pot != nil {
		o.PotTolerance, o.WiperResistance = w.Pot.Tolerance, w.Pot.Wiper
		o.PotMaxCurrent, o.PotMaxVoltage = w.Pot.MaxCurrent, w.Pot.MaxTerminalVoltage
	}
	m, err := predict.New(board, o)
	if err != nil {
		return nil, err
	}
	return &predictor{board: board, ensemble: m.Draw(draws, seed), burden: Burden(w)}, nil
}

// Burden is what the current meters put in series with the motor, Ω.
func Burden(w instruments.Wiring) (ohms float64) {
	for _, m := range w.Meters {
		if sweeps.Quantity(m.Reads) == sweeps.MotorCurrent {
			ohms += m.Burden
		}
	}
	return ohms
}

func (p *predictor) setting(supply, pot float64) predict.Setting {
	return predict.Setting{Supply: supply, Pot: pot, Temperature: predict.Reference, Burden: p.burden}
}

// At predicts at a measured supply voltage and the pot's ohms.
func (p *predictor) At(supply, pot float64) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag) {
	return p.ensemble.At(p.setting(supply, pot))
}

// Curves predicts along the pot for each supply voltage of the order.
func (p *predictor) Curves(order []sweeps.Setpoint) []sweeps.Curve {
	var supplies []float64
	pots := map[float64][]float64{}
	for _, s := range order {
		if !slices.Contains(supplies, s.Supply) {
			supplies = append(supplies, s.Supply)
		}
		if !slices.Contains(pots[s.Supply], s.Pot) {
			pots[s.Supply] = append(pots[s.Supply], s.Pot)
		}
	}
	var curves []sweeps.Curve
	for _, v := range supplies {
		slices.Sort(pots[v])
		curves = append(curves, p.ensemble.CurveAt(p.setting(v, 0), pots[v]))
	}
	return curves
}

// Tau is the motor's mechanical time constant J·R/K², s; 0 for a resistor.
func (p *predictor) Tau() float64 {
	l := p.board.Load
	if l.Kind != sweeps.Motor {
		return 0
	}
	k := l.TorqueConstant.SI()
	return l.Inertia.SI() * (l.Resistance.SI() + p.burden) / (k * k)
}

// Peak is the load's current with nothing but its least resistance in the way, A: a locked rotor's.
func (p *predictor) Peak(supply float64) float64 {
	r := p.board.Load.Resistance
	return supply / (r.SI()*(1-r.Tolerance) + p.burden)
}
