package pulse

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nightbench/sweeps/uncertainty"
)

// tally gathers how errors compare with the uncertainties stated for them.
type tally struct {
	n, covered, wrong, missing int
	zz                         float64
}

// add counts one result against the truth. An error above 5u without a flag that bears
// on the quantity is a confident wrong value.
func (t *tally) add(q Quantity, truth float64) {
	v := q.Value()
	e := math.Abs(v.X - truth)
	t.n++
	if e <= factor(v.DOF)*v.U {
		t.covered++
	}
	if e > 5*v.U && len(q.Flags) == 0 {
		t.wrong++
	}
	t.zz += min(sq(e/v.U), 25) // one gross error must not hide the rest
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

func (t *tally) ratio() float64 { return math.Sqrt(t.zz / float64(max(1, t.n))) }

func (t *tally) String() string {
	return fmt.Sprintf("%d values, 95 %% intervals cover %.1f %%, rms of error/u %.2f, unflagged errors above 5u: %d, missing: %d",
		t.n, 100*t.coverage(), t.ratio(), t.wrong, t.missing)
}

// check holds the tally to an honest uncertainty: not too small, and not larger than
// rectangular errors (which never leave 1.96 u) and caution about unseen bends make it.
func (t *tally) check(tb testing.TB, name string, most, least float64) {
	tb.Helper()
	tb.Logf("%-16s %s", name, t)
	chance := 2 * math.Sqrt(0.05*0.95/float64(max(1, t.n))) // of the share covered, from so few cases
	if c := t.coverage(); c < 0.94-chance || c > most+chance {
		tb.Errorf("%s: 95 %% intervals cover %.1f %%", name, 100*c)
	}
	if r := t.ratio(); r < least-chance || r > 1.1+chance {
		tb.Errorf("%s: rms of error/u is %.2f", name, r)
	}
	if 1000*t.wrong > max(t.n, 1000) {
		tb.Errorf("%s: %d of %d values are wrong by more than 5u without a flag", name, t.wrong, t.n)
	}
	if t.missing > 0 {
		tb.Errorf("%s: %d values missing", name, t.missing)
	}
}

func run(tb testing.TB, cases int, seed uint64, names []string, make func(*rand.Rand) specimen) map[string]*tally {
	tb.Helper()
	rng := rand.New(rand.NewPCG(seed, 2026))
	tallies := map[string]*tally{}
	for _, n := range names {
		tallies[n] = &tally{}
	}
	for range int(share * float64(cases)) {
		s := make(rng)
		r, err := Analyse(s.capture(rng), Options{})
		if err != nil {
			tb.Fatal(err)
		}
		truth := s.truth()
		for _, n := range names {
			if q, ok := r.Get(n); ok {
				tallies[n].add(q, truth[n])
			} else {
				tallies[n].missing++
			}
		}
	}
	return tallies
}

// Duty 1 to 99 %, 4 to 12 bits, from two periods and three samples in the shorter phase,
// noise to 2 % of the swing, straight, exponential, symmetric and ringing transitions.
func TestHonestUncertainty(t *testing.T) {
	names := []string{"duty", "period", "frequency", "t_high", "t_low", "average_voltage", "high_level", "low_level", "amplitude"}
	tallies := run(t, 5000, 1, names, func(rng *rand.Rand) specimen { return draw(rng, 3000) })
	for _, n := range names {
		tallies[n].check(t, n, 0.976, 0.79)
	}
}

func TestHonestUncertaintyOfThreeLevels(t *testing.T) {
	names := []string{"duty", "period", "average_voltage", "high_level", "low_level", "back_emf", "conduction"}
	tallies := run(t, 1000, 3, names, drawMotor)
	for _, n := range names {
		tallies[n].check(t, n, 0.99, 0.58)
	}
}

// A board whose every transition jitters by 0.03 to 1.5 samples: the truth is the mean
// of the process, which a record of few periods can only guess at.
func TestHonestUncertaintyUnderJitter(t *testing.T) {
	names := []string{"duty", "period", "average_voltage"}
	tallies := run(t, 1000, 6, names, func(rng *rand.Rand) specimen {
		s := draw(rng, 3000)
		s.jitter = s.interval * logUniform(rng, 0.03, 1.5)
		return s
	})
	for _, n := range names {
		tally := tallies[n]
		t.Logf("%-16s %s", n, tally)
		if tally.coverage() < 0.91 || tally.ratio() > 1.2 || tally.wrong > 5 {
			t.Errorf("%s: %s", n, tally)
		}
	}
}

// Records of up to a quarter million samples and thousands of periods.
func TestHonestUncertaintyOfLongRecords(t *testing.T) {
	names := []string{"duty", "period", "average_voltage", "high_level", "low_level"}
	tallies := run(t, 60, 5, names, func(rng *rand.Rand) specimen {
		s := draw(rng, 3000)
		s.n = int(logUniform(rng, 2e4, 2.5e5))
		return s
	})
	for _, n := range names {
		tally := tallies[n]
		t.Logf("%-16s %s", n, tally)
		if tally.coverage() < 0.92 || tally.ratio() < 0.6 || tally.ratio() > 1.2 || tally.wrong > 0 {
			t.Errorf("%s: %s", n, tally)
		}
	}
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
	s.up, s.down = ramp(logUniform(rng, 0.1, 3)*s.interval), ramp(logUniform(rng, 0.1, 3)*s.interval)
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
	t.Logf("%d motors, %d recognised, %d wrong without a flag", cases, known, wrong)
	if float64(cases) < 2000*share || 100*known < 97*cases || 500*wrong > cases {
		t.Errorf("%d motors, %d recognised, %d wrong without a flag", cases, known, wrong)
	}
}
