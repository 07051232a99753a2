package practice

import "math"

// Figures of the scope's front end and converter.
const (
	codesAScreen = 250.0 // of 8 bits: LOW at −125, UPP at +125
	scopeGain    = 0.02  // limit of error
	scopeOffset  = 0.01  // limit, as a share of the screen
	scopeNoise   = 0.4   // rms, in codes of 8 bits
	limitedTo    = 20e6  // Hz, the band limit
	coupledFrom  = 10.0  // Hz, AC coupling (common practice, no source)
)

// see is what the front end makes of the volts at the tips: the probe's own factor
// against the one the scope was told, bandwidth, coupling. The samples are changed in place.
func (s *scope) see(n int, in *input, y []float64, interval float64) {
	share := 1.0
	if f := in.fitted; f > 0 || s.slid.Load() {
		share = in.factor / s.probeFactor(in)
	}
	if s.loose.Load() {
		share = 0 // a loose clip: nothing but the channel's own noise
	}
	for i := range y {
		y[i] *= share
	}
	band := s.kind.Bandwidth
	if in.limited {
		band = math.Min(band, limitedTo)
	}
	lowPass(y, interval, band)
	switch in.coupling {
	case "AC":
		highPass(y, interval, coupledFrom)
	case "GND":
		clear(y)
	}
}

// probeFactor is what the probe really divides by.
func (s *scope) probeFactor(in *input) float64 {
	f := in.fitted
	if f == 0 {
		f = in.factor
	}
	switch {
	case !s.slid.Load():
		return f
	case f == 1:
		return 10
	}
	return f / 10
}

// lowPass is a single pole at frequency f (Hz). The wave stood still before the record.
func lowPass(y []float64, interval, f float64) {
	a := -math.Expm1(-2 * math.Pi * f * interval)
	for i := 1; i < len(y); i++ {
		y[i] = y[i-1] + a*(y[i]-y[i-1])
	}
}

// highPass is a single zero-frequency zero and a pole at f (Hz). The mean before the
// record was that of the record.
func highPass(y []float64, interval, f float64) {
	if len(y) == 0 {
		return
	}
	mean := 0.0
	for _, v := range y {
		mean += v / float64(len(y))
	}
	a, before := math.Exp(-2*math.Pi*f*interval), y[0]
	y[0] -= mean
	for i := 1; i < len(y); i++ {
		now := y[i]
		y[i] = a * (y[i-1] + now - before)
		before = now
	}
}

// perScreen is the converter's codes from the bottom of the screen to its top.
func (s *scope) perScreen() float64 { return codesAScreen * math.Ldexp(1, s.kind.Bits-8) }

// digitise turns volts as seen into codes: errors of the channel, noise, steps, clipping.
func (s *scope) digitise(in *input, y []float64) []int16 {
	codes := make([]int16, len(y))
	span, middle := in.high-in.low, (in.high+in.low)/2
	most := math.Ldexp(1, s.kind.Bits-1)
	noise := scopeNoise * math.Ldexp(1, (s.kind.Bits-8)/2) // a finer converter sees more of the front end's own
	for i, v := range y {
		v = v*(1+in.gain*scopeGain) + in.zero*scopeOffset*span
		k := quantise((v-middle)/span*s.perScreen()+s.rng.NormFloat64()*noise, 1)
		codes[i] = int16(min(max(k, -most), most-1))
	}
	return codes
}

// codesOf are one channel's converter codes of the last record, n from 1; digitised once, so that asking twice gives the same.
func (s *scope) codesOf(n int) (*acquisition, []int16, error) {
	r, err := s.record()
	if err != nil {
		return nil, nil, err
	}
	if r.codes[n-1] == nil {
		r.codes[n-1] = s.digitise(&r.inputs[n-1], r.y[n-1])
	}
	return r, r.codes[n-1], nil
}

// scale is a channel's volts a code, and volts at code 0.
func (s *scope) scale(in *input) (perCode, zero float64) {
	return (in.high - in.low) / s.perScreen(), (in.high + in.low) / 2
}
