package predict

import (
	"math"
	"os/exec"
	"testing"
	"time"

	"nightbench/sweeps"
)

// The promises of speed are ratios within one run: a setpoint against math.Exp,
// a curve against a setpoint. The fastest of several rounds counts, since other work may share the machine.

var sink float64

func fastest(rounds int, f func()) time.Duration {
	best := time.Duration(math.MaxInt64)
	for range rounds {
		start := time.Now()
		f()
		best = min(best, time.Since(start))
	}
	return best
}

func BenchmarkSetpoint(b *testing.B) {
	m := mustNew(b, pump(), Options{})
	s := Setting{Supply: 9, Pot: 10e3, Temperature: Reference}
	const n = 200
	exp := fastest(50, func() {
		for i := range n * 100 {
			sink += math.Exp(float64(i) / (n * 100))
		}
	})
	var point time.Duration
	for b.Loop() {
		point = fastest(50, func() {
			for range n {
				r, _ := m.At(s)
				sink += r.Values["duty"]
			}
		}) / n
	}
	b.ReportMetric(float64(point.Nanoseconds()), "ns/setpoint")
	b.ReportMetric(float64(point)/float64(exp)*(n*100), "exp/setpoint(promised:1500)")
}

func BenchmarkCurve(b *testing.B) {
	m := mustNew(b, pump(), Options{})
	s := Setting{Supply: 9, Pot: 10e3, Temperature: Reference}
	e := m.Draw(10000, 1)
	var pots []float64
	for k := range 25 {
		pots = append(pots, 1e3*math.Pow(100, float64(k)/24))
	}
	point := fastest(50, func() {
		for range 200 {
			r, _ := m.At(s)
			sink += r.Values["duty"]
		}
	}) / 200
	var curve time.Duration
	for b.Loop() {
		curve = fastest(3, func() { e.Curve(9, pots, Reference) })
	}
	b.ReportMetric(curve.Seconds(), "s/curve")
	b.ReportMetric(float64(curve)/float64(point), "setpoints/curve(promised:150000)")
}

func BenchmarkThousandDraws(b *testing.B) {
	e := mustNew(b, pump(), Options{}).Draw(1000, 1)
	for b.Loop() {
		e.At(Setting{Supply: 9, Pot: 10e3, Temperature: Reference})
	}
}

func BenchmarkSolve(b *testing.B) {
	m := mustNew(b, pump(), Options{})
	c := Setting{Supply: 9, Pot: 10e3, Temperature: Reference}.conditions()
	var d time.Duration
	for b.Loop() {
		d = fastest(50, func() {
			for range 200 {
				o := m.solve(&m.nominal, c)
				sink += o.emf
			}
		}) / 200
	}
	b.ReportMetric(float64(d.Nanoseconds()), "ns/solve")
}

// BenchmarkAgainstSimulator compares a setpoint with a transient simulation of the
// same steered board, timing alone and to a step of a thousandth of the shorter phase.
func BenchmarkAgainstSimulator(b *testing.B) {
	if _, err := exec.LookPath("ngspice"); err != nil {
		b.Skip("ngspice is not installed")
	}
	m := mustNew(b, pump(), Options{})
	s := Setting{Supply: 9, Pot: 10e3, Temperature: Reference}
	v := mustAt(b, m, s)
	point := fastest(50, func() {
		for range 200 {
			r, _ := m.At(s)
			sink += r.Values["duty"]
		}
	}) / 200
	var simulated time.Duration
	for b.Loop() {
		d := &deck{stop: 3 * v[sweeps.Period], step: min(v[sweeps.THigh], v[sweeps.TLow]) / 1000, temperature: Reference}
		spiceTiming(d, m, s)
		simulated = fastest(3, func() { d.simulate(b, "v(h)") })
	}
	b.ReportMetric(simulated.Seconds(), "s/simulation")
	b.ReportMetric(float64(simulated)/float64(point), "setpoints/simulation")
}
