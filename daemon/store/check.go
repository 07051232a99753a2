package store

import (
	"fmt"
	"math"

	"nightbench/sweeps"
)

// tooLarge is where a number stops being one: 9.9e37 and 9.91e37 stand for
// overload and not-a-number in instruments' replies, and must never become a value.
const tooLarge = 1e30

// check refuses what may not stand in the journal, before SQLite sees it:
// SQLite would store a not-a-number as NULL, which here means something else.
func check(e sweeps.Entry) error {
	switch {
	case (e.Kind == sweeps.KindPoint) != (e.Point != nil):
		return refuse("an entry of kind point has a point, others have none")
	case e.Kind == sweeps.KindEnded && !e.State.Ended():
		return refuse("an ended entry says how the run ended, not %q", e.State)
	case e.State != "" && e.Run == 0, e.Point != nil && e.Run == 0:
		return refuse("a %s entry belongs to a run", e.Kind)
	case !sound(e.Elapsed):
		return refuse("elapsed is %v s", e.Elapsed)
	case e.Point == nil:
		return nil
	}
	if err := checkPoint(*e.Point); err != nil {
		return fmt.Errorf("setpoint %d: %w", e.Point.Setpoint.Index, err)
	}
	return nil
}

func checkPoint(p sweeps.Point) error {
	if !sound(p.Elapsed) || !sound(p.Setpoint.Supply) || !sound(p.Setpoint.Pot) || !sound(p.Setpoint.Position) {
		return refuse("supply %v V, pot %v Ω at %v of its track, elapsed %v s: one is no number", p.Setpoint.Supply, p.Setpoint.Pot, p.Setpoint.Position, p.Elapsed)
	}
	for _, r := range p.Readings {
		if err := checkReading(r); err != nil {
			return fmt.Errorf("%s by %s: %w", r.Quantity, r.Road, err)
		}
	}
	for q, v := range p.Predictions {
		switch {
		case v.Unit != q.Unit() || v.Unit == "":
			return refuse("prediction of %s in %q; its unit is %q", q, v.Unit, q.Unit())
		case !sound(v.Value) || !sound(v.Low) || !sound(v.High) || v.Low > v.High:
			return refuse("prediction of %s: %v in %v to %v %s is no interval", q, v.Value, v.Low, v.High, v.Unit)
		}
	}
	for _, w := range p.Records {
		if !sound(w.Start) || !sound(w.Interval) || w.Interval <= 0 || !sound(w.VoltsPerCode) || !sound(w.VoltsAtZero) {
			return refuse("waveform of %s: scale or interval is no number", w.Node)
		}
	}
	return nil
}

func checkReading(r sweeps.Reading) error {
	switch {
	case r.Quantity.Unit() == "":
		return refuse("no such quantity")
	case r.Unit != r.Quantity.Unit():
		return refuse("given in %q; its unit is %q", r.Unit, r.Quantity.Unit())
	case (r.Value == nil) != (r.U == nil):
		return refuse("a value comes with its uncertainty, and no value with none")
	case r.Value == nil && len(r.Flags) == 0:
		return refuse("no value and no flag that says why")
	case r.Value != nil && !sound(*r.Value):
		return refuse("%v is no measured value", *r.Value)
	case r.U != nil && (!sound(*r.U) || *r.U < 0):
		return refuse("%v is no standard uncertainty", *r.U)
	case r.DOF != nil && (!sound(*r.DOF) || *r.DOF <= 0):
		return refuse("%v are no degrees of freedom", *r.DOF)
	}
	return nil
}

// sound tells a finite number of believable size.
func sound(x float64) bool { return math.Abs(x) < tooLarge }

func refuse(format string, args ...any) error {
	return fmt.Errorf("%w: "+format, append([]any{ErrRefused}, args...)...)
}
