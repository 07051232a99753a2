package drivertest

import (
	"math"
	"slices"
	"time"
)

// MakerMeter is a multimeter of some maker's on a steady input.
type MakerMeter struct {
	Maker
	Volts, Amperes float64            // at its terminals
	Current        bool               // it measures current
	Ranges         map[bool][]float64 // full scales, by Current
	Range          map[bool]float64   // in force
	Speed          map[bool]string    // in force, as its manual writes it
}

func newMakerMeter(end string, volts, amperes []float64) *MakerMeter {
	return &MakerMeter{Maker: Maker{End: end}, Ranges: map[bool][]float64{false: volts, true: amperes},
		Range: map[bool]float64{false: volts[len(volts)-1], true: amperes[len(amperes)-1]}, Speed: map[bool]string{}}
}

// reads is a reading in the form SD.DDDDDDDDESDD; beyond 120 % of the range it is 9.9E37.
func (m *MakerMeter) reads() string {
	x := m.Volts
	if m.Current {
		x = m.Amperes
	}
	if math.Abs(x) > 1.2*m.Range[m.Current] {
		return long(math.Copysign(9.9e37, x))
	}
	return long(x)
}

// upward takes the next range up.
func (m *MakerMeter) upward(current bool, x float64) {
	for _, r := range m.Ranges[current] {
		if r >= x*(1-1e-9) {
			m.Range[current] = r
			return
		}
	}
}

// nearest takes the nearest range, as the GDM-8261A does (p. 163: 2 V gives 10 V).
func (m *MakerMeter) nearest(current bool, x float64) {
	m.Range[current] = slices.MinFunc(m.Ranges[current], func(a, b float64) int {
		return int(1e3 * (math.Abs(math.Log(a/x)) - math.Abs(math.Log(b/x))))
	})
}

var (
	hpVolts, hpAmperes = []float64{0.1, 1, 10, 100, 1000}, []float64{0.01, 0.1, 1, 3}
	// of a meter with full scales of two
	twoVolts, twoAmperes = []float64{0.2, 2, 20, 200, 1000}, []float64{200e-6, 2e-3, 20e-3, 0.2, 2, 10}
)

// integrate takes the time of a reading with so many apertures, in periods of 50 Hz.
func (m *MakerMeter) integrate(apertures float64) {
	time.Sleep(time.Duration(apertures * number(m.Speed[m.Current]) / 50 * float64(time.Second)))
}
