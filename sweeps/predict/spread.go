package predict

import (
	"math"
	"math/rand/v2"
)

// shape is the distribution that a part's figure is drawn from.
type shape uint8

const (
	fixed       shape = iota
	rectangular       // equally likely between low and high
	normal            // low and high at two standard deviations either side
	triangular        // low, typical, high: the triangle of JCGM 101, 6.4.5, which may lean
	logarithmic       // rectangular in the logarithm, between low and high
)

// spread is a figure with its distribution. low ≤ typical ≤ high, all SI.
type spread struct {
	typical, low, high float64
	shape              shape
}

// exactly is a figure without spread.
func exactly(x float64) spread { return spread{typical: x, low: x, high: x} }

// tolerance is the spread of a nominal value with a relative half-width.
func tolerance(nominal, relative float64, isNormal bool) spread {
	if relative == 0 || nominal == 0 {
		return exactly(nominal)
	}
	h := math.Abs(nominal) * relative
	s := spread{typical: nominal, low: nominal - h, high: nominal + h, shape: rectangular}
	if isNormal {
		s.shape = normal
	}
	return s
}

// draw makes one value. A normal draw beyond six standard deviations, or of the
// wrong sign for a figure that has one, is held at a thousandth of the typical value.
func (s *spread) draw(r *rand.Rand) float64 {
	switch s.shape {
	case rectangular:
		return s.low + (s.high-s.low)*r.Float64()
	case normal:
		return s.sameSign(s.typical + (s.high-s.low)/4*r.NormFloat64())
	case triangular:
		return s.triangle(r.Float64())
	case logarithmic:
		return s.low * math.Pow(s.high/s.low, r.Float64())
	}
	return s.typical
}

func (s *spread) sameSign(x float64) float64 {
	if s.typical != 0 && x*s.typical <= 0 {
		return s.typical / 1000
	}
	return x
}

// triangle is the inverse of the triangular distribution function at p.
func (s *spread) triangle(p float64) float64 {
	width := s.high - s.low
	if p*width < s.typical-s.low {
		return s.low + math.Sqrt(p*width*(s.typical-s.low))
	}
	return s.high - math.Sqrt((1-p)*width*(s.high-s.typical))
}
