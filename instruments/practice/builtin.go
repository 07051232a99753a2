package practice

import (
	"math"
	"slices"

	"nightbench/instruments/scpi"
)

// The built-in measurements: of the last record, with levels at 10, 50 and 90 %
// between the lowest and the highest sample. Where there is nothing to measure
// the scope says so with its token.
var builtIn = map[string]func(w *wave) (float64, bool){
	"VMAXimum":   func(w *wave) (float64, bool) { return w.high, true },
	"VMINimum":   func(w *wave) (float64, bool) { return w.low, true },
	"VPP":        func(w *wave) (float64, bool) { return w.high - w.low, true },
	"VAVerage":   func(w *wave) (float64, bool) { return w.mean, true },
	"PERiod":     func(w *wave) (float64, bool) { return w.period() },
	"FREQuency":  func(w *wave) (float64, bool) { t, ok := w.period(); return 1 / t, ok },
	"PWIDth":     func(w *wave) (float64, bool) { return w.width(true) },
	"NWIDth":     func(w *wave) (float64, bool) { return w.width(false) },
	"PDUTycycle": func(w *wave) (float64, bool) { return w.share(true) },
	"DCYCle":     func(w *wave) (float64, bool) { return w.share(true) }, // the standard's other name of it
	"NDUTycycle": func(w *wave) (float64, bool) { return w.share(false) },
}

func (s *scope) registerMeasure() {
	channel := scpi.Choice{Words: []string{"CH1", "CH2", "CH3", "CH4"}}
	for name, of := range builtIn {
		s.Get("MEASure:"+name, func(c *scpi.Call) (string, error) {
			n := numberOf(c.Word(0))
			r, codes, err := s.codesOf(n)
			if err != nil {
				return "", err
			}
			v, ok := of(s.wave(r, n, codes))
			if !ok || math.IsNaN(v) || math.IsInf(v, 0) {
				return s.kind.NoValue, nil
			}
			if s.kind.Percent && slices.Contains([]string{"PDUTycycle", "DCYCle", "NDUTycycle"}, name) {
				v *= 100
			}
			return scpi.NR3(v), nil
		}, channel)
	}
}

// wave is a record as the scope's own arithmetic sees it.
type wave struct {
	interval        float64
	low, high, mean float64
	rising, falling []float64 // crossings of the middle, in samples
}

// wave works on the codes, as the scope does: its noise and clipping are in.
func (s *scope) wave(r *acquisition, n int, codes []int16) *wave {
	perCode, zero := s.scale(&r.inputs[n-1])
	w := &wave{interval: r.interval, low: math.Inf(1), high: math.Inf(-1)}
	y := make([]float64, len(codes))
	for i, k := range codes {
		y[i] = float64(k)*perCode + zero
		w.low, w.high, w.mean = math.Min(w.low, y[i]), math.Max(w.high, y[i]), w.mean+y[i]/float64(len(codes))
	}
	w.cross(y, 8*perCode*math.Ldexp(1, s.kind.Bits-8))
	return w
}

// cross finds the crossings of the middle between the lowest and the highest sample. A wave
// lower than least (V) is a line with noise and has none. A swing has to pass 60 % to count the next.
func (w *wave) cross(y []float64, least float64) {
	if w.high-w.low < least {
		return
	}
	middle, band := (w.high+w.low)/2, (w.high-w.low)/10
	above := y[0] > middle
	armed := math.Abs(y[0]-middle) > band
	for i := 1; i < len(y); i++ {
		if now := y[i] > middle; now != above && armed {
			at := float64(i-1) + (middle-y[i-1])/(y[i]-y[i-1])
			if now {
				w.rising = append(w.rising, at)
			} else {
				w.falling = append(w.falling, at)
			}
			above, armed = now, false
		}
		armed = armed || math.Abs(y[i]-middle) > band && (y[i] > middle) == above
	}
}

// period is the mean over all whole periods, s.
func (w *wave) period() (float64, bool) {
	n := len(w.rising)
	if n < 2 {
		return 0, false
	}
	return (w.rising[n-1] - w.rising[0]) / float64(n-1) * w.interval, true
}

// width is the first whole pulse, s: above the middle or below it.
func (w *wave) width(above bool) (float64, bool) {
	from, to := w.rising, w.falling
	if !above {
		from, to = to, from
	}
	for _, a := range from {
		for _, b := range to {
			if b > a {
				return (b - a) * w.interval, true
			}
		}
	}
	return 0, false
}

// share is a pulse's share of the period.
func (w *wave) share(above bool) (float64, bool) {
	t, ok := w.period()
	p, found := w.width(above)
	return p / t, ok && found
}
