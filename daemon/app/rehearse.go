package app

import (
	"fmt"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
	"nightbench/sweeps/runner"
	"nightbench/sweeps/schedule"
)

// Rehearsal is a plan gone through against the prediction.
type Rehearsal struct {
	Setpoints []Rehearsed       `json:"setpoints"`
	Findings  []predict.Finding `json:"findings"`   // cautions; what refuses the plan is an error
	Seconds   float64           `json:"seconds"`    // bench time it takes at the least
	NotJudged []string          `json:"not_judged"` // what a missing bench file left open
	Ambient   float64           `json:"ambient"`    // °C, what is predicted for
}

// Rehearsed is one setpoint with what is predicted there.
type Rehearsed struct {
	sweeps.Setpoint
	Place       string                                `json:"place"`
	Predictions map[sweeps.Quantity]sweeps.Prediction `json:"predictions"`
	Flags       []sweeps.Flag                         `json:"flags"`
}

// imagined is the pot assumed where no bench file says which one it is: fine enough to
// land near any value. The prediction doesn't use it: a wiper's track has to be known.
var imagined = instruments.PotWiring{Codes: 1025, EndToEnd: 1e6, Wiper: 0}

// Rehearse checks a plan against its board and, where there is one, the bench, and
// predicts every setpoint. It touches no instrument.
func Rehearse(plan sweeps.Plan, board sweeps.Board, w *instruments.Wiring) (Rehearsal, error) {
	if err := sweeps.CheckPlan(plan, board, w); err != nil {
		return Rehearsal{}, err
	}
	r := Rehearsal{Setpoints: []Rehearsed{}, NotJudged: []string{}}
	bench, pot := instruments.Wiring{}, &imagined
	if w != nil {
		bench, pot = *w, w.Pot
	} else {
		r.NotJudged = append(r.NotJudged, "no bench file: its limits, which instruments give the quantities, the pot's codes and tolerance, and two nodes on earth; name it with --bench")
	}
	r.Ambient, _ = Ambient(plan)
	p, err := newPredictor(board, bench, r.Ambient, 1)
	if err != nil {
		return Rehearsal{}, err
	}
	order, err := schedule.Order(plan, pot, 1)
	if err != nil {
		return Rehearsal{}, err
	}
	if r.Findings, err = p.judge(order); err != nil {
		return Rehearsal{}, fmt.Errorf("%s: %w", plan.Path, err)
	}
	for _, s := range order {
		values, flags := p.At(s.Supply, s.Pot)
		r.Setpoints = append(r.Setpoints, Rehearsed{Setpoint: s, Place: runner.Place(s), Predictions: values, Flags: flags})
	}
	r.Findings = append(r.Findings, tripsTooLow(plan.Trips, r.Setpoints)...)
	r.Seconds = runner.AtLeast(plan, p, order)
	return r, nil
}

// tripsTooLow are the trips whose limit lies below what is predicted: such a plan ends at its first hot setpoint.
func tripsTooLow(trips []sweeps.Trip, all []Rehearsed) (found []predict.Finding) {
	for _, t := range trips {
		f := predict.Finding{Name: "trip_below_prediction"}
		worst := t.Limit
		for _, s := range all {
			x, ok := s.Predictions[t.Quantity]
			if !ok || x.High <= t.Limit {
				continue
			}
			f.Count++
			if x.High > worst {
				worst = x.High
				f.Setting = predict.Setting{Supply: s.Supply, Pot: s.Pot}
				if s.Position > 0 {
					f.Setting.Pot = s.Position
				}
				f.Words = fmt.Sprintf("%s trips at %s, and up to %s is predicted", t.Quantity, si.Format(t.Limit, x.Unit), si.Format(x.High, x.Unit))
			}
		}
		if f.Count > 0 {
			found = append(found, f)
		}
	}
	return found
}
