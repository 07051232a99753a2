package circuit

import (
	"math"
	"testing"
)

// plainly sees what a Mean sees but is never carried over a leap.
type plainly struct{ m *Mean }

func (p plainly) Window() (from, to float64) { return p.m.Window() }
func (p plainly) Observe(g *Segment)         { p.m.Observe(g) }

// A meter's aperture over many periods: leaping must give what integrating every
// period gives, 0.1 % of the swing (the promise for leaps) and in fact far better.
func TestMeanCarriedOverLeapsEqualsIntegration(t *testing.T) {
	for _, aperture := range []float64{0.02, 0.1, 0.2003, 0.5} {
		var got [2][2]float64
		for k := range got {
			s := spinning(t, 5e3)
			from := s.Now()
			volts := NewMean(Between(LoadHi, LoadLo), from, from+aperture)
			amps := NewMean(Through(LoadCurrent), from+0.3*aperture, from+aperture)
			var o [2]Observer = [2]Observer{volts, amps}
			if k == 1 {
				o = [2]Observer{plainly{volts}, plainly{amps}}
			}
			if err := s.Run(from+aperture, o[:]...); err != nil {
				t.Fatal(err)
			}
			got[k] = [2]float64{volts.Value(), amps.Value()}
			if math.Abs(volts.seen-aperture) > 1e-9 {
				t.Errorf("aperture %g s: saw %g s", aperture, volts.seen)
			}
		}
		for i, name := range []string{"mean voltage", "mean current"} {
			if d := math.Abs(got[0][i]/got[1][i] - 1); d > 1e-4 {
				t.Errorf("%s over %g s: leapt %.9g, integrated %.9g", name, aperture, got[0][i], got[1][i])
			}
		}
	}
}
