package app

import (
	"errors"
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
	"nightbench/sweeps/runner"
)

// draws is how many boards a band is drawn from, one a curve.
const draws = 1000

// predictor predicts for a run: at the bench's burden and the plan's ambient, with the pot's tolerance, always the same boards.
type predictor struct {
	model    *predict.Model
	ensemble *predict.Ensemble
	burden   float64 // Ω in the motor's loop
	ambient  float64 // °C
	track    float64 // Ω end to end of the bench's pot where its wiper stands in the network; 0: it doesn't
}

// newPredictor draws the boards once; ambient is in °C, the seed is the run's.
func newPredictor(board sweeps.Board, w instruments.Wiring, ambient float64, seed uint64) (*predictor, error) {
	o := predict.Options{}
	if w.Pot != nil {
		o.PotTolerance, o.WiperResistance = w.Pot.Tolerance, w.Pot.Wiper
		o.PotMaxCurrent, o.PotMaxVoltage = w.Pot.MaxCurrent, w.Pot.MaxTerminalVoltage
		o.Track = track(*w.Pot)
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
	p := &predictor{model: m, ensemble: m.Draw(draws, seed), burden: Burden(w), ambient: ambient}
	if board.Timing.Track.Pot {
		p.track = w.Pot.EndToEnd
	}
	return p, nil
}

// track is a pot end to end, within its tolerance.
func track(w instruments.PotWiring) si.TolResistance {
	return si.TolResistance{Nominal: si.Ohms(w.EndToEnd), Tolerance: w.Tolerance}
}

// AloneOptions are those of a board predicted by itself: a pot given in ohms is exact. Of
// the bench count what its pot bears, and its track where its wiper stands in the timing
// network. w may be nil.
func AloneOptions(board sweeps.Board, w *instruments.Wiring) (o predict.Options) {
	if w == nil || w.Pot == nil || !board.Timing.UsesPot() {
		return o
	}
	o.PotMaxCurrent, o.PotMaxVoltage = w.Pot.MaxCurrent, w.Pot.MaxTerminalVoltage
	if board.Timing.Track.Pot {
		o.Track, o.WiperResistance = track(*w.Pot), w.Pot.Wiper
	}
	return o
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

// setting is one for the model, which wants a share of the track where a wiper
// stands in the network: the pot's ohms are those of its charging share.
func (p *predictor) setting(supply, pot float64) predict.Setting {
	if p.track > 0 {
		pot /= p.track
	}
	return predict.Setting{Supply: supply, Pot: pot, Temperature: p.ambient, Burden: p.burden}
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
		curves = append(curves, p.curve(v, spread(ends[v][0], ends[v][1])))
	}
	return curves
}

// curve predicts along the pot's ohms.
func (p *predictor) curve(supply float64, ohms []float64) sweeps.Curve {
	pots := make([]float64, len(ohms))
	for i, r := range ohms {
		pots[i] = p.setting(supply, r).Pot
	}
	c := p.ensemble.CurveAt(p.setting(supply, 0), pots)
	c.Pot = ohms
	return c
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

// Where names a setting of a board for people, as a setpoint's place is named.
func Where(board sweeps.Board, s predict.Setting) string {
	at := sweeps.Setpoint{Supply: s.Supply, Pot: s.Pot}
	if board.Timing.Network == sweeps.Wiper {
		at.Pot, at.Position = 0, s.Pot
	}
	return runner.Place(at)
}

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
			refused = append(refused, fmt.Errorf("%s: %s", Where(p.model.Board(), f.Setting), f.Words))
		}
	}
	if len(refused) > 0 {
		return findings, fmt.Errorf("the plan is refused: %w", errors.Join(refused...))
	}
	return findings, nil
}
