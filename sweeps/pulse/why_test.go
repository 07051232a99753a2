package pulse

import (
	"math"
	"testing"
)

// A result has each of its parameters, or says why not.
func TestWhyThereIsNoValue(t *testing.T) {
	s := timer()
	sine := make([]float64, 1200)
	for i := range sine {
		sine[i] = 4 + 3*math.Sin(float64(i)/20)
	}
	flat := make([]float64, 1200)
	for name, r := range map[string]Result{
		"pulses":   analyse(t, s.capture(rng()), Options{}),
		"untimed":  analyse(t, s.capture(rng()), Options{}).Untimed(),
		"sine":     analyse(t, s.record(s.digitise(sine, rng()), 0, 1e-5), Options{}),
		"constant": analyse(t, s.record(s.digitise(flat, rng()), 0, 1e-5), Options{}),
	} {
		for _, p := range Parameters {
			q, ok := r.Get(p.Name)
			why := r.Why(p.Name)
			if ok == (len(why) > 0) || ok && q.Unit != p.Unit {
				t.Errorf("%s: %s %v, unit %q, why %v", name, p.Name, ok, q.Unit, why)
			}
			for _, f := range why {
				if f.Name == "" || f.Words == "" {
					t.Errorf("%s: %s: flag without words: %+v", name, p.Name, f)
				}
			}
		}
	}
	if why := analyse(t, s.capture(rng()), Options{}).Untimed().Why("period"); why[0].Name != TimeBase {
		t.Errorf("untimed period: %v", why)
	}
}

func TestRecordBySample(t *testing.T) {
	r := Record{Codes: []int16{1, 2, 3}, Zero: 1, PerCode: 2, Start: 5, Interval: 0.5}
	if r.Len() != 3 || r.Volt(2) != 7 || r.At(2) != 6 || r.Index(5.7) != 1 || r.Index(4) != 0 || r.Index(9) != 2 {
		t.Errorf("%d samples; %g V at %g s; %d %d %d", r.Len(), r.Volt(2), r.At(2), r.Index(5.7), r.Index(4), r.Index(9))
	}
	r = Record{Volts: []float64{4, 5}, Times: []float64{1, 3}}
	if r.Len() != 2 || r.Volt(1) != 5 || r.At(1) != 3 || r.Index(2) != 0 {
		t.Errorf("%d samples; %g V at %g s", r.Len(), r.Volt(1), r.At(1))
	}
}

// Without noise a capture in volts may hold two values only: a pulse train all the same.
func TestTwoValues(t *testing.T) {
	r := Record{Interval: 1e-5}
	for i := range 560 {
		r.Volts = append(r.Volts, 0.12+8.8*float64(b2i((i+70)%100 < 30)))
	}
	res := analyse(t, r, Options{})
	is(t, res, TwoLevel, FewCodes)
	agrees(t, res, "duty", 0.3)
	agrees(t, res, "high_level", 8.92)
	if len(quantity(t, res, "high_level").Flags) == 0 || len(quantity(t, res, "duty").Flags) > 0 {
		t.Error("the levels carry the flag, the duty does not")
	}
}

// The converter's step is found from values that are whole multiples of it, if no two are neighbours.
func TestGrid(t *testing.T) {
	var volts []float64
	for i := range 200 {
		volts = append(volts, 0.25*[]float64{0, 2, 5, 31, 34, 36, 0, 36}[i%8])
	}
	if step, unseen := grid(volts, 0, 9); unseen > 0 || math.Abs(step-0.25) > 1e-9 {
		t.Errorf("step %g, unseen %g", step, unseen)
	}
}
