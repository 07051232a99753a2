package runner

import (
	"context"
	"fmt"
	"math"

	"nightbench/instruments"
	"nightbench/instruments/si"
	"nightbench/sweeps"
)

// memo keeps the prediction of the setpoint in hand: it is asked for more than once.
type memo struct {
	supply, pot float64
	values      map[sweeps.Quantity]sweeps.Prediction
}

// predicted is what the schematic gives at a setpoint.
func (r *Runner) predicted(at sweeps.Setpoint) map[sweeps.Quantity]sweeps.Prediction {
	if m := &r.predict; m.values == nil || m.supply != at.Supply || m.pot != at.Pot {
		p, _ := r.o.Predict.At(at.Supply, at.Pot)
		*m = memo{at.Supply, at.Pot, p}
	}
	return r.predict.values
}

// takes is how long one reading lasts with the settings in force, s of bench time.
type takes struct{ reading, record float64 }

// expected is what the prediction says of a setpoint, as far as settings need it.
type expected struct{ period, duty float64 }

// expect predicts period and duty. Where the schematic predicts none, a board of 100 Hz is assumed: slow enough for every road.
func (r *Runner) expect(at sweeps.Setpoint) expected {
	p := r.predicted(at)
	e := expected{period: p[sweeps.Period].Value, duty: p[sweeps.Duty].Value}
	if !(e.period > 0) || !(e.duty > 0 && e.duty < 1) {
		return expected{period: 0.01, duty: 0.5}
	}
	return e
}

// Settings of the measuring instruments (BENCH-PRACTICE's rules: range by peak, aperture
// from the period, record of ten periods and fifty samples in the shorter phase).
const (
	headroom      = 1.2  // of the range over the supply or the stall current
	apertureShare = 1e-3 // wanted of the aperture term, as a share of the swing
	leastAperture = 0.1  // s
	mostAperture  = 2.0  // s
	periods       = 12
	samplesAPhase = 50
	mostPoints    = 20000
)

// aperture is long enough that the aperture term stays below its share of the swing, s.
func aperture(e expected) float64 {
	return math.Min(math.Max(e.duty*(1-e.duty)*e.period/apertureShare, leastAperture), mostAperture)
}

// setUpMeasuring tells meters and scope what the setpoint needs.
func (r *Runner) setUpMeasuring(ctx context.Context, at sweeps.Setpoint) error {
	e := r.expect(at)
	aperture := aperture(e)
	r.takes = takes{reading: 2 * aperture, record: 2 * periods * e.period} // auto-zero; as long again until the trigger
	for i, m := range r.o.Bench.Meters {
		s := instruments.MeterSettings{Unit: sweeps.Quantity(r.o.Bench.Wiring.Meters[i].Reads).Unit(), Aperture: aperture}
		switch s.Unit {
		case si.Ampere:
			s.Range = headroom * r.o.Predict.Peak(at.Supply)
		default:
			s.Range = headroom * at.Supply
		}
		err := r.again(ctx, 0, func(ctx context.Context) error { _, err := m.Configure(ctx, s); return err })
		if err != nil {
			return fmt.Errorf("meter %q: %w", r.o.Bench.Wiring.Meters[i].Name, err)
		}
	}
	return r.setUpScope(ctx, at, e)
}

func (r *Runner) setUpScope(ctx context.Context, at sweeps.Setpoint, e expected) error {
	w := r.o.Bench.Wiring.Scope
	if w == nil {
		return nil
	}
	short := math.Min(e.duty, 1-e.duty) * e.period
	s := instruments.ScopeSettings{Duration: periods * e.period}
	s.Points = int(math.Min(math.Ceil(s.Duration/(short/samplesAPhase)), mostPoints))
	for _, c := range w.Channels {
		s.Channels = append(s.Channels, instruments.ScopeChannel{Number: c.Number, Low: -0.1 * at.Supply, High: headroom * at.Supply, Probe: c.Probe})
	}
	if len(w.Channels) > 0 {
		s.Trigger = instruments.ScopeTrigger{Channel: w.Channels[0].Number, Level: at.Supply / 2}
	}
	err := r.again(ctx, 0, func(ctx context.Context) error { _, err := r.o.Bench.Scope.Configure(ctx, s); return err })
	if err != nil {
		return fmt.Errorf("scope: %w", err)
	}
	return nil
}

// AtLeast is the bench time a plan takes at the least, s: warm-up, settling five
// time constants, and the repeats of the slowest meter, auto-zero counted.
func AtLeast(plan sweeps.Plan, p Predictor, order []sweeps.Setpoint) float64 {
	r := &Runner{o: Options{Predict: p}}
	total := 0.0
	if plan.WarmUp != nil {
		total = plan.WarmUp.For.Seconds()
	}
	settle := 5 * math.Max(p.Tau(), supplyTau)
	for _, s := range order {
		total += settle + float64(plan.Measure.Repeats)*2*aperture(r.expect(s))
	}
	return total
}
