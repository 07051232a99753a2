package pulse

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// tally gathers how errors compare with the uncertainties stated for them.
type tally struct {
	n, covered, wrong, missing int
	zz                         float64
}

func (t *tally) add(x, truth, u, half float64, flagged bool) {
	t.n++
	e := math.Abs(x - truth)
	if e <= half {
		t.covered++
	}
	if e > 5*u && !flagged {
		t.wrong++
	}
	z := e / u
	t.zz += min(z*z, 100)
}

func (t *tally) String() string {
	return fmt.Sprintf("n %5d  covered %5.1f %%  rms(error/u) %.2f  >5u unflagged %d  missing %d",
		t.n, 100*float64(t.covered)/float64(t.n), math.Sqrt(t.zz/float64(t.n)), t.wrong, t.missing)
}

var judged = []string{"duty", "period", "frequency", "t_high", "t_low", "average_voltage", "high_level", "low_level", "amplitude"}

func TestCoverage(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	total := map[string]*tally{}
	get := func(k string) *tally {
		if total[k] == nil {
			total[k] = &tally{}
		}
		return total[k]
	}
	parts := map[string]float64{}
	for i := range 3000 {
		s := draw(rng, 20000)
		r, err := Analyse(s.capture(rng), Options{})
		if err != nil {
			t.Fatal(err)
		}
		for name, want := range s.truth() {
			q, ok := r.Get(name)
			if !ok {
				get(name).missing++
				if name == "duty" && testing.Verbose() {
					t.Logf("case %d %s: no duty: %s %v; duty %.3f bits %d n %d noise %.3f", i, s.shape, r.Class, r.Flags, s.duty, s.bits, s.n, s.noise/(s.high-s.low))
				}
				continue
			}
			v := q.Value()
			if name == "duty" || name == "high_level" {
				for _, c := range q.Components {
					parts[name+" "+s.shape+" "+c.Source] += c.Share() * c.Share() / v.U / v.U / 500
				}
			}
			get(name).add(v.X, want, v.U, v.Expanded(0.95), len(q.Flags) > 0)
			get(name+" "+s.shape).add(v.X, want, v.U, v.Expanded(0.95), len(q.Flags) > 0)
			if math.Abs(v.X-want) > 5*v.U && testing.Verbose() {
				t.Logf("case %d %s %s: %g want %g u %g z %.1f; duty %.3f bits %d n %d per period %.1f noise %.4f class %s flags %v", i, s.shape, name, v.X, want, v.U, (v.X-want)/v.U, s.duty, s.bits, s.n, s.period/s.interval, s.noise/(s.high-s.low), r.Class, r.Flags)
			}
		}
	}
	for k, v := range parts {
		t.Logf("part %s %.2f", k, v)
	}
	for _, k := range judged {
		t.Logf("%-16s %s", k, get(k))
		for _, sh := range []string{"step", "ramp", "exponential", "gaussian", "ringing", "mixed"} {
			t.Logf("      %-12s %s", sh, get(k+" "+sh))
		}
	}
}
