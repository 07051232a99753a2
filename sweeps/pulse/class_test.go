package pulse

import (
	"math"
	"math/rand/v2"
	"testing"
)

// timer is a plain pulse train of the pump driver: 9 V, 30 %, 100 samples a period.
func timer() specimen {
	var s specimen
	s.low, s.high, s.period, s.duty, s.start = 0.1, 8.9, 1e-3, 0.3, 2.17e-4
	s.up, s.down = step(), step()
	s.bits, s.bottom, s.span = 10, -4, 20
	s.n, s.interval = 1200, 1.003e-5
	s.noise = 0.02
	return s
}

func analyse(t *testing.T, r Record, o Options) Result {
	t.Helper()
	res, err := Analyse(r, o)
	if err != nil {
		t.Fatal(err)
	}
	for _, q := range res.Quantities {
		if err := q.Check(); err != nil {
			t.Errorf("%s: %v", q.Name, err)
		}
	}
	return res
}

func rng() *rand.Rand { return rand.New(rand.NewPCG(11, 12)) }

// agrees fails unless the quantity is there and within 4u of the truth.
func agrees(t *testing.T, r Result, name string, truth float64) {
	t.Helper()
	q, ok := r.Get(name)
	if !ok {
		t.Errorf("no %s; %s, flags %v", name, r.Class, r.Flags)
		return
	}
	if math.Abs(q.X-truth) > 4*q.U() {
		t.Errorf("%s is %.6g, u %.2g; want %.6g; %s, flags %v", name, q.X, q.U(), truth, r.Class, r.Flags)
	}
}

func is(t *testing.T, r Result, class Class, flags ...string) {
	t.Helper()
	if r.Class != class {
		t.Errorf("class %q, want %q; flags %v", r.Class, class, r.Flags)
	}
	for _, f := range flags {
		if !r.Flagged(f) {
			t.Errorf("flag %q missing; got %v", f, r.Flags)
		}
	}
}

// A record small enough to check by hand: codes 0 and 100, transitions through one sample.
// Rising through 50 at 2 + 50/60 and 12 + 50/60; falling at 6 + 50/80; whole period 10 samples.
func TestByHand(t *testing.T) {
	codes := []int16{0, 0, 0, 60, 100, 100, 100, 20, 0, 0, 0, 0, 0, 60, 100, 100, 100, 20, 0, 0, 0, 0, 0, 60, 100, 100}
	r := analyse(t, Record{Codes: codes, PerCode: 0.1, Start: 5, Interval: 1e-3}, Options{})
	is(t, r, TwoLevel, EdgeTooFast)
	if r.Periods != 2 || len(r.Instants) != 5 {
		t.Fatalf("%d periods, %d instants", r.Periods, len(r.Instants))
	}
	rise, fall := 2+50.0/60, 6+50.0/80
	for name, want := range map[string]float64{
		"period": 10e-3, "frequency": 100, "t_high": (fall - rise) * 1e-3, "duty": (fall - rise) / 10,
		"high_level": 10, "low_level": 0, "amplitude": 10, "average_voltage": 3.8,
	} {
		q, _ := r.Get(name)
		if math.Abs(q.X-want) > 1e-9*math.Abs(want)+1e-12 {
			t.Errorf("%s is %.9g, want %.9g", name, q.X, want)
		}
	}
	if got := r.Instants[0].T; math.Abs(got-(5+rise*1e-3)) > 1e-12 || !r.Instants[0].Rising {
		t.Errorf("first instant %v", r.Instants[0])
	}
}

func TestTwoLevel(t *testing.T) {
	s := timer()
	r := analyse(t, s.capture(rng()), Options{})
	is(t, r, TwoLevel)
	for name, truth := range s.truth() {
		agrees(t, r, name, truth)
	}
	agrees(t, r, "rms", math.Sqrt(s.duty*sq(s.high)+(1-s.duty)*sq(s.low)))
	agrees(t, r, "jitter", 0)
	agrees(t, r, "overshoot", 0)
	agrees(t, r, "ripple", 0)
}

func TestUnsettledLevelIsFlagged(t *testing.T) {
	s := timer()
	s.duty = 0.5
	s.up, s.down = exponential(8e-4), exponential(8e-4)
	r := analyse(t, s.capture(rng()), Options{})
	if r.Class == TwoLevel && !r.Flagged(Unsettled) {
		t.Errorf("class %q, flags %v", r.Class, r.Flags)
	}
}

func TestTransitionsAndRinging(t *testing.T) {
	s := timer()
	s.up, s.down = ramp(8e-5), exponential(6e-5)
	r := analyse(t, s.capture(rng()), Options{})
	is(t, r, TwoLevel)
	agrees(t, r, "rise_time", 8e-5)
	agrees(t, r, "fall_time", 6e-5)

	s.up, s.down = ringing(1.2e-4, 5e-5), ringing(1.2e-4, 5e-5)
	r = analyse(t, s.capture(rng()), Options{})
	peak := 0.0
	for x := 0.0; x < 2e-4; x += 1e-7 {
		peak = max(peak, s.up.h(x)-1)
	}
	agrees(t, r, "overshoot", peak)
	agrees(t, r, "undershoot", peak)
	agrees(t, r, "high_level", s.high)
}

// Ringing deep enough to pass the 50 % level again would give a plain crossing
// counter twice the frequency; the state boundaries do not let it.
func TestRingingThroughTheMiddle(t *testing.T) {
	s := timer()
	s.up, s.down = ringing(4e-5, 6e-5), ringing(4e-5, 6e-5)
	s.n, s.interval, s.noise = 6000, 2.003e-6, 0.01
	r := analyse(t, s.capture(rng()), Options{})
	agrees(t, r, "period", s.period)
	agrees(t, r, "duty", s.share())
}

func TestJitter(t *testing.T) {
	s := timer()
	s.jitter, s.n = 2e-5, 20000
	r := analyse(t, s.capture(rng()), Options{})
	agrees(t, r, "jitter", 2e-5*math.Sqrt2)
	agrees(t, r, "period", s.period)
	agrees(t, r, "duty", s.duty)
}

func TestRipple(t *testing.T) {
	s := timer()
	volts := s.wave(grid0(s.n, 0, s.interval), rng())
	for i := range volts {
		if volts[i] > 5 {
			volts[i] += 0.25 * math.Sin(float64(i)/7)
		}
	}
	r := analyse(t, s.record(s.digitise(volts, rng()), 0, s.interval), Options{})
	agrees(t, r, "ripple", 0.5)
	agrees(t, r, "high_level", s.high)
}

func TestFreewheelAndRest(t *testing.T) {
	s := timer()
	s.low, s.freewheel, s.conduct = 5.2, -0.6, 0.42
	r := analyse(t, s.capture(rng()), Options{})
	is(t, r, FreewheelRest)
	for name, truth := range s.truth() {
		agrees(t, r, name, truth)
	}
}

// Three samples of freewheel a period are enough; so are a stalled motor, a fast
// one, commutation ripple on the rest, ringing into the rest, and long records.
func TestFreewheelAndRestOfAllKinds(t *testing.T) {
	for name, change := range map[string]func(s *specimen){
		"short freewheel": func(s *specimen) { s.conduct = 0.33 },
		"stalled":         func(s *specimen) { s.low = 0.3 },
		"fast":            func(s *specimen) { s.low = 8 },
		"ringing":         func(s *specimen) { s.up = ringing(4e-5, 3e-5) },
		"long":            func(s *specimen) { s.n, s.interval = 100_000, 1.0007e-6 },
	} {
		s := timer()
		s.low, s.freewheel, s.conduct = 5.2, -0.6, 0.42
		change(&s)
		r := analyse(t, s.capture(rng()), Options{})
		if r.Class != FreewheelRest {
			t.Errorf("%s: class %q, flags %v", name, r.Class, r.Flags)
		}
		agrees(t, r, "back_emf", s.low)
		agrees(t, r, "duty", s.share())
		agrees(t, r, "low_level", s.freewheel)
	}

	s := timer()
	s.low, s.freewheel, s.conduct = 5.2, -0.6, 0.42
	volts := s.wave(grid0(s.n, 0, s.interval), rng())
	for i, v := range volts {
		if v > 5.1 && v < 5.3 {
			volts[i] += 0.4 * math.Sin(float64(i)/5)
		}
	}
	r := analyse(t, s.record(s.digitise(volts, rng()), 0, s.interval), Options{})
	is(t, r, FreewheelRest)
	agrees(t, r, "back_emf", s.low)
}

// A supply that sinks through the record, mains hum, and brush spikes leave the times alone.
func TestDisturbedLevels(t *testing.T) {
	for name, disturb := range map[string]func(i int, v float64) float64{
		"sinking supply": func(i int, v float64) float64 { return v * (1 - 0.1*float64(i)/1200) },
		"drift":          func(i int, v float64) float64 { return v + 0.5*float64(i)/1200 },
		"hum":            func(i int, v float64) float64 { return v + 0.3*math.Sin(float64(i)/320) },
		"spikes":         func(i int, v float64) float64 { return v + 3*float64(b2i(i%53 == 7)) },
	} {
		s := timer()
		volts := s.wave(grid0(s.n, 0, s.interval), rng())
		for i := range volts {
			volts[i] = disturb(i, volts[i])
		}
		r := analyse(t, s.record(s.digitise(volts, rng()), 0, s.interval), Options{})
		if r.Class != TwoLevel {
			t.Errorf("%s: class %q, flags %v", name, r.Class, r.Flags)
		}
		agrees(t, r, "duty", s.share())
		agrees(t, r, "period", s.period)
	}
}

// At load_lo the node is low when driven; against the supply it reads as across the load.
func TestAgainstSupply(t *testing.T) {
	s := timer()
	s.low, s.freewheel, s.conduct = 5.2, -0.6, 0.42
	const supply = 9.0
	volts := s.wave(grid0(s.n, 0, s.interval), rng())
	for i := range volts {
		volts[i] = supply - volts[i]
	}
	node := s.record(s.digitise(volts, rng()), 0, s.interval)
	node.Instrument, node.GainU, node.OffsetU = "scope channel 2, 2 V", 0.01, 0.005
	r := analyse(t, node.Against(supply), Options{})
	is(t, r, FreewheelRest)
	for name, truth := range s.truth() {
		agrees(t, r, name, truth)
	}
	// A gain error acts on what the probe saw, here 0.1 V, not on the 8.9 V across the load.
	for _, c := range quantity(t, r, "high_level").Components {
		if c.Source == "scope gain" && math.Abs(c.Share()) > 0.01*0.2 {
			t.Errorf("gain contributes %.3g V", c.Share())
		}
	}
	flat := node
	flat.Codes = nil
	for _, c := range node.Codes {
		flat.Volts = append(flat.Volts, node.Zero+node.PerCode*float64(c))
	}
	agrees(t, analyse(t, flat.Against(supply), Options{}), "back_emf", s.low)
}

func quantity(t *testing.T, r Result, name string) Quantity {
	t.Helper()
	q, ok := r.Get(name)
	if !ok {
		t.Fatalf("no %s", name)
	}
	return q
}

func TestSaggingTop(t *testing.T) {
	s := timer()
	for _, s.sag = range []float64{0.05, 0.2, 0.4} {
		r := analyse(t, s.capture(rng()), Options{})
		is(t, r, SaggingTop, Sagging)
		agrees(t, r, "duty", s.duty)
		agrees(t, r, "average_voltage", s.mean())
		if len(quantity(t, r, "high_level").Flags) == 0 {
			t.Error("high level of a sagging top must carry the flag")
		}
	}
}

func TestConstant(t *testing.T) {
	s := timer()
	s.noise = 0.05
	threshold := 4.5
	for name, c := range map[string]struct {
		level float64
		o     Options
		class Class
		as    string
	}{
		"high":    {8.9, Options{Threshold: &threshold}, ConstantHigh, "high_level"},
		"low":     {0.2, Options{Threshold: &threshold}, ConstantLow, "low_level"},
		"unknown": {3.3, Options{}, Constant, "level"},
	} {
		volts := make([]float64, 1000)
		for i := range volts {
			volts[i] = c.level
		}
		for _, s.noise = range []float64{0, 0.01, 0.05, 0.3} {
			r := analyse(t, s.record(s.digitise(volts, rng()), 0, 1e-5), c.o)
			if r.Class != c.class {
				t.Errorf("%s, noise %g: class %q, flags %v", name, s.noise, r.Class, r.Flags)
			}
			agrees(t, r, c.as, c.level)
			agrees(t, r, "average_voltage", c.level)
		}
	}
}

func TestNotPulses(t *testing.T) {
	s := timer()
	waves := map[string]func(x float64) float64{
		"sine":     func(x float64) float64 { return 4 + 3*math.Sin(x/20) },
		"triangle": func(x float64) float64 { return 8 * math.Abs(math.Mod(x/130, 1)-0.5) },
		"one step": func(x float64) float64 { return 8 * step().h(x-400) },
		"ramp":     func(x float64) float64 { return x / 200 },
	}
	for name, f := range waves {
		volts := make([]float64, 1200)
		for i := range volts {
			volts[i] = f(float64(i))
		}
		r := analyse(t, s.record(s.digitise(volts, rng()), 0, 1e-5), Options{})
		if r.Class != NotPulses && r.Class != Constant {
			t.Errorf("%s: class %q", name, r.Class)
		}
		if _, ok := r.Get("duty"); ok {
			t.Errorf("%s has a duty", name)
		}
	}
}
