package pulse

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"testing"
)

// Samples printed with so many digits that their grid has more steps over the range
// than 16 bits count: levels and mean are those of the samples all the same.
func TestFinePrintOverAWideRange(t *testing.T) {
	for _, c := range []struct {
		high   float64
		digits int
		noise  float64
		n      int
	}{{9, 4, 0.01, 1000}, {9, 4, 0.001, 10000}, {9, 4, 0.02, 10000}, {70, 3, 0.1, 1000}, {6.4, 4, 0.01, 1000}, {8.9, 4, 0.005, 2000}, {9, 5, 0.01, 1000}} {
		t.Run(fmt.Sprintf("%g V, %d decimals, %d samples", c.high, c.digits, c.n), func(t *testing.T) {
			r := rand.New(rand.NewPCG(7, uint64(c.n)))
			volts := make([]float64, c.n)
			mean, whole := 0.0, c.n/250*250
			for i := range volts {
				v := 0.02
				if i%250 <= 180 {
					v = c.high
				}
				x, err := strconv.ParseFloat(strconv.FormatFloat(v+c.noise*(r.Float64()-0.5), 'f', c.digits, 64), 64)
				if err != nil {
					t.Fatal(err)
				}
				volts[i] = x
				if i < whole {
					mean += x / float64(whole)
				}
			}
			res, err := Analyse(Record{Volts: volts, Interval: 1e-6, Resolution: math.Pow10(-c.digits), Instrument: "file"}, Options{})
			if err != nil {
				t.Fatal(err)
			}
			for name, want := range map[string]float64{"high_level": c.high, "low_level": 0.02, "average_voltage": mean, "duty": 181. / 250} {
				q, ok := res.Get(name)
				if !ok || math.Abs(q.X-want) > 5*q.U()+1e-3*c.high {
					t.Errorf("%s: %v, %g (u %g), want %g; class %s, flags %v", name, ok, q.X, q.U(), want, res.Class, res.Flags)
				}
			}
		})
	}
}
