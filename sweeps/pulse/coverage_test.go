package pulse

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"nightbench/sweeps/uncertainty"
)

// tally gathers how errors compare with the uncertainties stated for them.
type tally struct {
	n, covered, wrong, missing int
	zz, ee, uu                 float64
}

// add counts one result against the truth, errors in units of scale. An error above 5u
// without a flag that bears on the quantity is a confident wrong value.
func (t *tally) add(q Quantity, truth, scale float64) {
	v := q.Value()
	e := math.Abs(v.X - truth)
	t.n++
	if e <= factor(v.DOF)*v.U {
		t.covered++
	}
	if e > 5*v.U && len(q.Flags) == 0 {
		t.wrong++
	}
	t.zz += min(sq(e/v.U), 25) // one gross error must not hide the rest; wrong counts it
	t.ee += sq(min(e, 5*v.U) / scale)
	t.uu += sq(v.U / scale)
}

var factors = map[float64]float64{}

// factor remembers coverage factors, whose Student quantiles take longer than an analysis.
func factor(dof float64) float64 {
	dof = math.Floor(dof)
	if _, ok := factors[dof]; !ok {
		factors[dof] = uncertainty.CoverageFactor(0.95, dof)
	}
	return factors[dof]
}

func (t *tally) coverage() float64 { return float64(t.covered) / float64(max(1, t.n)) }

// each is the rms of error over u, joint the rms of the errors over the rms of the u, which the
// few worst records decide.
func (t *tally) each() float64  { return math.Sqrt(t.zz / float64(max(1, t.n))) }
func (t *tally) joint() float64 { return math.Sqrt(t.ee / max(t.uu, 1e-300)) }

// honest holds the tally to what is asked of every uncertainty: 95 % intervals cover 93 to
// 97 %, the rms of error over u is 0.8 to 1.2, and fewer than one in a thousand values are
// confidently wrong; each with two standard deviations for the number of cases.
func (t *tally) honest() bool {
	n := float64(max(1, t.n))
	c, r := 2*math.Sqrt(0.05*0.95/n), 2/math.Sqrt(2*n)
	inside := func(x, low, high, slack float64) bool { return x >= low-slack && x <= high+slack }
	return inside(t.coverage(), 0.93, 0.97, c) && inside(t.each(), 0.8, 1.2, r) &&
		float64(t.wrong) <= max(1, n/1000+2*math.Sqrt(n/1000)) && 1000*t.missing <= t.n
}

// family is a kind of waveform, how its cases are made, and which quantities it tells of.
type family struct {
	name  string
	cases int
	make  func(*rand.Rand) specimen
	names string
	// optional: quantities that a record may leave out, where it cannot resolve them
	optional string
}

var families = []family{
	{"pulse trains", 5000, func(rng *rand.Rand) specimen { return draw(rng, 3000) },
		"duty period frequency t_high t_low average_voltage high_level low_level amplitude rms", ""},
	{"three levels", 1000, drawMotor, "duty period t_high average_voltage high_level low_level amplitude back_emf conduction", ""},
	{"jitter", 1000, drawJitter, "duty period average_voltage jitter", ""},
	{"transitions", 2500, drawTransitions, "", "rise_time fall_time"},
	{"overshoot", 1500, drawAberrations, "overshoot undershoot", ""},
	{"ripple", 1500, drawRipple, "ripple high_level duty", ""},
	{"long records", 40, drawLong, "duty period average_voltage high_level low_level rms", ""},
}

// The table of what the uncertainties are worth: duty 1 to 99 %, 4 to 12 bits, 8 to a million samples,
// noise to 2 % of the swing; straight, exponential, symmetric, ringing transitions; three levels, jitter, ripple.
func TestCoverage(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2026))
	t.Logf("%-13s %-16s %6s %8s %10s %10s %6s %7s", "waveforms", "quantity", "values", "covered", "rms(e/u)", "rms/rms", "wrong", "missing")
	for _, f := range families {
		tallies := f.run(t, rng)
		for _, name := range strings.Fields(f.names + " " + f.optional) {
			c := tallies[name]
			t.Logf("%-13s %-16s %6d %6.1f %% %10.2f %10.2f %6d %7d", f.name, name, c.n, 100*c.coverage(), c.each(), c.joint(), c.wrong, c.missing)
			if !c.honest() {
				t.Errorf("%s: the uncertainty of %s is not honest", f.name, name)
			}
		}
	}
}

func (f family) run(tb testing.TB, rng *rand.Rand) map[string]*tally {
	tb.Helper()
	tallies := map[string]*tally{}
	must := strings.Fields(f.names)
	all := append(strings.Fields(f.optional), must...)
	for _, n := range all {
		tallies[n] = &tally{}
	}
	for range int(share * float64(f.cases)) {
		s := f.make(rng)
		r, err := Analyse(s.capture(rng), Options{})
		if err != nil {
			tb.Fatal(err)
		}
		truth := s.truth()
		for _, n := range all {
			x, known := truth[n]
			q, ok := r.Get(n)
			switch {
			case ok && known:
				tallies[n].add(q, x, s.scale(q.Unit))
			case known && contains(must, n):
				tallies[n].missing++
			}
		}
	}
	return tallies
}

// scale is what an error in the unit is compared with.
func (s *specimen) scale(unit string) float64 {
	return map[string]float64{"s": s.period, "Hz": 1 / s.period, "V": s.high - s.low, "1": 1}[unit]
}

// drawJitter makes a board whose every transition jitters by 0.03 to 1.5 samples: the truth is the
// mean of the process, which a record of few periods can only guess at.
func drawJitter(rng *rand.Rand) specimen {
	s := draw(rng, 3000)
	s.jitter = s.interval * logUniform(rng, 0.03, 1.5)
	return s
}

// drawTransitions makes transitions of about three samples and more.
func drawTransitions(rng *rand.Rand) specimen {
	s := draw(rng, 3000)
	short := min(s.duty, 1-s.duty) * s.period
	kinds := []func(float64) response{ramp, exponential, gaussian}
	s.up = kinds[rng.IntN(3)](logUniform(rng, 0.03, 0.15) * short)
	s.down = kinds[rng.IntN(3)](logUniform(rng, 0.03, 0.15) * short)
	return s
}

// drawAberrations makes flat tops, and ringing of four samples and more a period.
func drawAberrations(rng *rand.Rand) specimen {
	s := draw(rng, 3000)
	short := min(s.duty, 1-s.duty) * s.period
	s.up, s.down = ramp(0.05*short), gaussian(0.05*short)
	if most := 0.15 * short; rng.IntN(2) == 0 && most > 4*s.interval {
		p := logUniform(rng, 4*s.interval, most)
		s.up, s.down = ringing(p, p*uniform(rng, 0.15, 0.7)), ringing(p, p*uniform(rng, 0.15, 0.7))
		swing := s.high - s.low
		s.span = swing / uniform(rng, 0.3, 0.4)
		s.bottom = s.low - uniform(rng, 0.42, 0.58)*(s.span-swing)
	}
	return s
}

// drawRipple makes a high state with a sine on it, from none to a tenth of the swing, a few
// periods of it a state and at least twelve samples each.
func drawRipple(rng *rand.Rand) specimen {
	for {
		s := draw(rng, 3000)
		per := s.duty * s.period / s.interval
		if per < 60 {
			continue
		}
		short := min(s.duty, 1-s.duty) * s.period
		s.up, s.down = ramp(0.05*short), ramp(0.05*short)
		s.rippled = (s.high - s.low) * uniform(rng, 0, 0.1) * float64(rng.IntN(2))
		s.ripple = s.interval * logUniform(rng, 12, per/4)
		return s
	}
}

// drawLong makes records of twenty thousand to a million samples.
func drawLong(rng *rand.Rand) specimen {
	s := draw(rng, 3000)
	s.n = int(logUniform(rng, 2e4, 1e6))
	return s
}

// drawMotor makes a freewheeling motor: driven, freewheel at a diode drop below zero, rest at the back-EMF.
func drawMotor(rng *rand.Rand) specimen {
	var s specimen
	s.period = logUniform(rng, 1e-4, 1e-2)
	s.duty = uniform(rng, 0.1, 0.6)
	s.conduct = s.duty + uniform(rng, 0.05, 0.3)
	per := logUniform(rng, 250, 600)
	s.interval = s.period / per
	s.n = int(per * uniform(rng, 3.1, 12))
	s.start = uniform(rng, 0, 1) * s.period
	s.high = uniform(rng, 4.5, 12)
	s.freewheel = -uniform(rng, 0.3, 0.9)
	s.low = s.high * uniform(rng, 0.25, 0.75)
	kinds := []func(float64) response{ramp, exponential, gaussian, func(float64) response { return step() }}
	s.up, s.down = kinds[rng.IntN(4)](logUniform(rng, 0.1, 3)*s.interval), kinds[rng.IntN(4)](logUniform(rng, 0.1, 3)*s.interval)
	s.bits = 8 + rng.IntN(5)
	s.span = (s.high + 1) * uniform(rng, 1.3, 2)
	s.bottom = -uniform(rng, 1.2, 1.6)
	s.noise = uniform(rng, 0, 0.01) * s.high
	return s
}

// Motors of all kinds, from six samples in the shortest phase and levels eight times the
// noise apart: nearly all are recognised, and those that are not say so or are right.
func TestMotorsAreRecognised(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 3))
	cases, known, wrong := 0, 0, 0
	for range int(3000 * share) {
		s := drawMotor(rng)
		s.up, s.down = ramp(logUniform(rng, 0.1, 3)*s.interval), ramp(logUniform(rng, 0.1, 3)*s.interval)
		s.duty = uniform(rng, 0.03, 0.9)
		s.conduct = s.duty + (1-s.duty)*uniform(rng, 0.05, 0.9)
		s.low = s.high * uniform(rng, 0, 0.95)
		s.noise = uniform(rng, 0, 0.02) * s.high
		shortest := min(s.duty, s.conduct-s.duty, 1-s.conduct) * s.period / s.interval
		if shortest < 6 || min(s.high-s.low, s.low-s.freewheel) < 8*s.noise {
			continue
		}
		r, err := Analyse(s.capture(rng), Options{})
		if err != nil {
			t.Fatal(err)
		}
		cases++
		known += b2i(r.Class == FreewheelRest)
		q, _ := r.Get("duty")
		wrong += b2i(math.Abs(q.X-s.share()) > 5*q.U() && len(q.Flags) == 0)
	}
	said := fmt.Sprintf("%d motors, %d recognised, %d wrong without a flag", cases, known, wrong)
	t.Log(said)
	if float64(cases) < 2000*share || 100*known < 97*cases || 500*wrong > max(cases, 500) {
		t.Error(said)
	}
}

// From two whole periods and three samples in the shorter phase on, under noise up to 2 %
// of the swing, there is a value with its uncertainty, never too small a one: with one or two
// periods nothing tells how fast the transitions are, so it may be a little large.
func TestShortRecordsHaveValues(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	f := family{"short", 1500, drawShort, "duty period t_high t_low average_voltage high_level low_level amplitude", ""}
	for name, c := range f.run(t, rng) {
		t.Logf("%-16s %6d %6.1f %% %10.2f %6d %7d", name, c.n, 100*c.coverage(), c.each(), c.wrong, c.missing)
		if c.missing > 0 || c.coverage() < 0.93 || c.each() > 1.2 || c.each() < 0.7 || 1000*c.wrong > c.n {
			t.Errorf("%s: %d missing, %d wrong, covered %.3f, rms %.2f", name, c.missing, c.wrong, c.coverage(), c.each())
		}
	}
}

// drawShort makes records of 2.05 to 3 periods, the shorter phase of three to thirty samples.
func drawShort(rng *rand.Rand) specimen {
	s := draw(rng, 3000)
	short := min(s.duty, 1-s.duty)
	per := logUniform(rng, 3.05, 30) / short
	s.interval = s.period / per
	s.n = int(uniform(rng, 2.05, 3)*per) + 2
	s.up, s.down = step(), step()
	if rng.IntN(2) == 0 {
		s.up, s.down = exponential(0.1*short*s.period), exponential(0.1*short*s.period)
	}
	s.ring = 0
	return s
}
