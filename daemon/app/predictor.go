package app

import (
	"errors"
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// draws is how many boards a band is drawn from, one a curve.
const draws = 1000

// predictor predicts for a run: at the bench's burden, with the pot's tolerance, always the same boards.
type predictor struct {
	model    *predict.Model
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
	for _, meter := range w.Meters {
		if sweeps.Quantity(meter.Reads) == sweeps.AverageVoltage {
			o.Average = meter.Between
		}
	}
	m, err := predict.New(board, o)
	if err != nil {
		return nil, err
	}
	return &predictor{model: m, ensemble: m.Draw(draws, seed), burden: Burden(w)}, nil
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

// curvePoints draw a curve that looks smooth on the page.
const curvePoints = 49

// Curves predicts along the pot for each supply voltage of the order: from the
// least to the largest resistance visited there, evenly in the logarithm.
func (p *predictor) Curves(order []sweeps.Setpoint) []sweeps.Curve {
	var supplies []float64
	ends := map[float64][2]float64{}
	for _, s := range order {
		e, seen := ends[s.Supply]
		if !seen {
			supplies = append(supplies, s.Supply)
			e = [2]float64{s.Pot, s.Pot}
		}
		ends[s.Supply] = [2]float64{min(e[0], s.Pot), max(e[1], s.Pot)}
	}
	var curves []sweeps.Curve
	for _, v := range supplies {
		curves = append(curves, p.ensemble.CurveAt(p.setting(v, 0), spread(ends[v][0], ends[v][1])))
	}
	return curves
}

// spread are resistances from low to high, evenly in the logarithm; one where there is no span.
func spread(low, high float64) []float64 {
	if !(low > 0) || high <= low {
		return []float64{low}
	}
	all := make([]float64, curvePoints)
	for i := range all {
		all[i] = low * math.Pow(high/low, float64(i)/(curvePoints-1))
	}
	all[curvePoints-1] = high
	return all
}

// Tau is the motor's mechanical time constant, s; 0 for a resistor.
func (p *predictor) Tau() float64 { return p.model.Tau() }

// Peak bounds the load's current at a supply voltage, A: the rotor held.
func (p *predictor) Peak(supply float64) float64 { return p.model.Peak(supply) }

// judge goes through the setpoints before any is visited: what a plan is refused
// or cautioned for. The error names what it is refused for.
func (p *predictor) judge(order []sweeps.Setpoint) ([]predict.Finding, error) {
	settings := make([]predict.Setting, len(order))
	for i, s := range order {
		settings[i] = p.setting(s.Supply, s.Pot)
	}
	findings, err := p.model.Judge(settings)
	if err != nil {
		return nil, err
	}
	var refused []error
	for _, f := range findings {
		if f.Refuse {
			refused = append(refused, fmt.Errorf("%s, %s: %s", si.Format(f.Setting.Supply, si.Volt), si.Short(f.Setting.Pot), f.Words))
		}
	}
	if len(refused) > 0 {
		return findings, fmt.Errorf("the plan is refused: %w", errors.Join(refused...))
	}
	return findings, nil
}
