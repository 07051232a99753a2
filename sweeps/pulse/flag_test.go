package pulse

import (
	"math"
	"testing"

	"nightbench/sweeps/uncertainty"
)

func TestClipped(t *testing.T) {
	s := timer()
	s.bottom, s.span = -4, 12 // up to 8 V
	r := analyse(t, s.capture(rng()), Options{})
	is(t, r, TwoLevel, Clipped)
	if len(quantity(t, r, "high_level").Flags) == 0 {
		t.Error("a clipped high level must carry the flag")
	}
	if len(quantity(t, r, "duty").Flags) > 0 {
		t.Error("clipping does not touch the duty")
	}
	agrees(t, r, "duty", s.duty)
}

func TestFewPeriods(t *testing.T) {
	s := timer()
	s.n = 160
	r := analyse(t, s.capture(rng()), Options{})
	is(t, r, TwoLevel, FewPeriods)
	agrees(t, r, "duty", s.duty)
	s.n = 60
	is(t, analyse(t, s.capture(rng()), Options{}), NotPulses, FewPeriods)
}

// From two whole periods and three samples in the shorter phase on there is a value.
func TestSmallestRecord(t *testing.T) {
	codes := []int16{10, 10, 90, 91, 90, 10, 11, 10, 10, 90, 90, 91, 11, 10, 10, 10, 90, 90}
	r := analyse(t, Record{Codes: codes, PerCode: 0.1, Interval: 1e-4}, Options{})
	is(t, r, TwoLevel)
	agrees(t, r, "period", 7e-4)
	agrees(t, r, "duty", 3.0/7)
	agrees(t, r, "high_level", 9.03)
}

func TestEightSamples(t *testing.T) {
	r := analyse(t, Record{Codes: []int16{0, 0, 90, 90, 90, 0, 0, 90}, PerCode: 0.1, Interval: 1e-4}, Options{})
	is(t, r, TwoLevel, FewPeriods)
	agrees(t, r, "period", 5e-4)
}

func TestUndersampled(t *testing.T) {
	s := timer()
	s.duty = 0.013
	r := analyse(t, s.capture(rng()), Options{})
	is(t, r, TwoLevel, Undersampled)
	agrees(t, r, "period", s.period)
	agrees(t, r, "duty", s.duty)
}

func TestRuntAndNotches(t *testing.T) {
	s := timer()
	volts := s.wave(grid0(s.n, 0, s.interval), rng())
	for i := 60; i < 68; i++ {
		volts[i] = 5.5 // passes the middle, never gets high
	}
	r := analyse(t, s.record(s.digitise(volts, rng()), 0, s.interval), Options{})
	is(t, r, TwoLevel, Runt)
	agrees(t, r, "period", s.period)

	for _, width := range []int{1, 2} {
		volts = s.wave(grid0(s.n, 0, s.interval), rng())
		high := 0
		for i := range volts {
			if volts[i] < 5 {
				high = 0
				continue
			}
			if high++; high >= 12 && high < 12+width && i%3 > 0 {
				volts[i] = s.low
			}
		}
		r = analyse(t, s.record(s.digitise(volts, rng()), 0, s.interval), Options{})
		is(t, r, TwoLevel, Notch)
		agrees(t, r, "period", s.period)
		agrees(t, r, "duty", s.duty)
	}
}

func TestMissingPulsesAreIrregular(t *testing.T) {
	s := timer()
	volts := s.wave(grid0(s.n, 0, s.interval), rng())
	for i := 300; i < 500; i++ {
		volts[i] = s.low
	}
	r := analyse(t, s.record(s.digitise(volts, rng()), 0, s.interval), Options{})
	if !r.Flagged(Irregular) {
		t.Errorf("flags %v", r.Flags)
	}
	if len(quantity(t, r, "duty").Flags) == 0 {
		t.Error("the duty must carry the flag")
	}
}

func TestScaleOfTheProbe(t *testing.T) {
	s := timer()
	for factor, flagged := range map[float64]bool{1: false, 10: true, 0.1: true, 1.3: false} {
		rec := s.capture(rng())
		rec.PerCode *= factor
		rec.Zero *= factor
		r := analyse(t, rec, Options{Expected: 9})
		if r.Flagged(Scale) != flagged {
			t.Errorf("probe off by %g: flags %v", factor, r.Flags)
		}
	}
}

// A capture with the wrong range may span a few codes only.
func TestFewCodes(t *testing.T) {
	s := timer()
	s.noise = 0
	for _, bits := range []int{3, 4} {
		s.bits = bits
		r := analyse(t, s.capture(rng()), Options{})
		is(t, r, TwoLevel, FewCodes)
		for name, truth := range s.truth() {
			agrees(t, r, name, truth)
		}
	}
}

// Eight bits left-aligned in sixteen, as several makers send them.
func TestLeftAlignedCodes(t *testing.T) {
	s := timer()
	s.bits, s.noise = 8, 0
	rec := s.capture(rng())
	plain := quantity(t, analyse(t, rec, Options{}), "high_level")
	for i := range rec.Codes {
		rec.Codes[i] = (rec.Codes[i] - 128) << 8
	}
	rec.PerCode /= 256
	rec.Zero += rec.PerCode * 128 * 256
	rec.ClipLow, rec.ClipHigh = nil, nil
	got := quantity(t, analyse(t, rec, Options{}), "high_level")
	if math.Abs(got.X-plain.X) > 1e-9 || math.Abs(got.U()-plain.U()) > 0.01*plain.U() {
		t.Errorf("left-aligned %.6g, u %.3g; plain %.6g, u %.3g", got.X, got.U(), plain.X, plain.U())
	}
}

func TestTimeStamps(t *testing.T) {
	s := timer()
	rec := s.capture(rng())
	even := grid0(s.n, 0, s.interval)

	rec.Times = even
	r := analyse(t, rec, Options{})
	is(t, r, TwoLevel)
	agrees(t, r, "period", s.period)
	if r.Flagged(UnevenTime) || r.Flagged(CoarseTime) {
		t.Errorf("even stamps flagged: %v", r.Flags)
	}

	rec.Times = make([]float64, s.n)
	for i, x := range even {
		rec.Times[i] = math.Round(x/5e-5) * 5e-5 // five samples share a stamp
	}
	r = analyse(t, rec, Options{})
	is(t, r, TwoLevel, CoarseTime)
	agrees(t, r, "period", s.period)
	agrees(t, r, "duty", s.duty)

	uneven := rng()
	times := make([]float64, s.n)
	for i := range times {
		times[i] = even[i] + s.interval*uniform(uneven, 0, 0.9)
	}
	rec = s.record(s.digitise(s.wave(times, rng()), rng()), 0, 0)
	rec.Times = times
	r = analyse(t, rec, Options{})
	is(t, r, TwoLevel, UnevenTime)
	agrees(t, r, "period", s.period)
	agrees(t, r, "duty", s.duty)
	agrees(t, r, "average_voltage", s.mean())
}

func TestVoltsInsteadOfCodes(t *testing.T) {
	s := timer()
	rec := s.capture(rng())
	volts := Record{Interval: rec.Interval}
	for _, c := range rec.Codes {
		volts.Volts = append(volts.Volts, math.Round((rec.Zero+rec.PerCode*float64(c))*1e4)/1e4) // as printed
	}
	a, b := analyse(t, rec, Options{}), analyse(t, volts, Options{})
	for name := range s.truth() {
		p, q := quantity(t, a, name), quantity(t, b, name)
		if math.Abs(p.X-q.X) > 0.3*p.U()+1e-4*math.Abs(p.X) || q.U() < 0.7*p.U() || q.U() > 1.4*p.U() {
			t.Errorf("%s: from codes %.6g, u %.3g; from volts %.6g, u %.3g", name, p.X, p.U(), q.X, q.U())
		}
	}
}

// Two records through one range: their gain and offset errors are the same.
func TestSharedInstrumentCancels(t *testing.T) {
	s := timer()
	level := func(high float64) uncertainty.Budget {
		s.high = high
		rec := s.capture(rng())
		rec.Instrument, rec.GainU, rec.OffsetU, rec.TimeBaseU = "scope channel 1, 2 V", 0.02, 0.05, 1e-4
		return quantity(t, analyse(t, rec, Options{}), "high_level").Budget
	}
	a, b := level(8.9), level(8.7)
	if a.U() < 0.15 {
		t.Errorf("u of one level is %.3g V: gain and offset are missing", a.U())
	}
	if d := uncertainty.Difference(a, b); d.U() > 0.02*0.3+0.01 || math.Abs(d.X-0.2) > 4*d.U() {
		t.Errorf("difference %.3g V, u %.3g V", d.X, d.U())
	}
}

func TestRefuses(t *testing.T) {
	codes := []int16{0, 1, 0, 1}
	for name, r := range map[string]Record{
		"empty":            {},
		"two samples":      {Codes: codes[:2], PerCode: 1, Interval: 1},
		"no scale":         {Codes: codes, Interval: 1},
		"no interval":      {Codes: codes, PerCode: 1},
		"negative time":    {Codes: codes, PerCode: 1, Interval: -1},
		"not a number":     {Volts: []float64{0, math.NaN(), 1, 0}, Interval: 1},
		"overload":         {Volts: []float64{0, math.Inf(1), 1, 0}, Interval: 1},
		"stamps missing":   {Codes: codes, PerCode: 1, Times: []float64{0, 1}},
		"stamps backwards": {Codes: codes, PerCode: 1, Times: []float64{0, 2, 1, 3}},
		"stamps all equal": {Codes: codes, PerCode: 1, Times: []float64{1, 1, 1, 1}},
	} {
		if _, err := Analyse(r, Options{}); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}
