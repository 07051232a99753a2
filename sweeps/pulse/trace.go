package pulse

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// trace is a record made uniform: codes that rise with the voltage, whatever the
// capture delivered, and the times of the samples.
type trace struct {
	Record
	codes    []int16
	volt     float64 // V per code, positive
	zero     float64 // V at code 0
	clipLow  int     // codes at and beyond which the converter saturates
	clipHigh int
	printed  float64 // codes, standard uncertainty of one code's voltage as it was written
	cell     float64 // s, sample interval; root mean square where uneven
	flags    []Flag
}

var (
	errShort = errors.New("fewer than three samples")
	errScale = errors.New("volts per code and sample interval must be finite and not zero")
)

func newTrace(r Record) (trace, error) {
	t := trace{Record: r, flags: slices.Clone(r.Flags), clipLow: math.MinInt32, clipHigh: math.MaxInt32}
	n := max(len(r.Codes), len(r.Volts))
	if n < 3 {
		return t, errShort
	}
	if err := t.timing(n); err != nil {
		return t, err
	}
	if r.Codes == nil {
		return t, t.quantise()
	}
	if bad(r.PerCode) || math.IsNaN(r.Zero) || math.IsInf(r.Zero, 0) {
		return t, errScale
	}
	t.codes, t.volt, t.zero = r.Codes, r.PerCode, r.Zero
	if r.ClipLow != nil {
		t.clipLow = int(*r.ClipLow)
	}
	if r.ClipHigh != nil {
		t.clipHigh = int(*r.ClipHigh)
	}
	if t.volt < 0 {
		t.invert()
	}
	return t, nil
}

func bad(x float64) bool { return x == 0 || math.IsNaN(x) || math.IsInf(x, 0) }

// invert turns falling codes into rising ones: ^code is −code − 1, which cannot overflow.
func (t *trace) invert() {
	codes := make([]int16, len(t.codes))
	for i, c := range t.codes {
		codes[i] = ^c
	}
	t.codes, t.zero, t.volt = codes, t.zero-t.volt, -t.volt
	low, high := math.MinInt32, math.MaxInt32
	if t.ClipHigh != nil {
		low = ^int(*t.ClipHigh)
	}
	if t.ClipLow != nil {
		high = ^int(*t.ClipLow)
	}
	t.clipLow, t.clipHigh = low, high
}

// volts is the voltage at a code, fractional codes included.
func (t *trace) volts(code float64) float64 { return t.zero + t.volt*code }

// at is the time of a sample, fractional indices included.
func (t *trace) at(i float64) float64 {
	if t.Times == nil {
		return t.Start + i*t.Interval
	}
	k := min(int(i), len(t.Times)-2)
	return t.Times[k] + (i-float64(k))*(t.Times[k+1]-t.Times[k])
}

// timing checks the time stamps. Stamps too coarse to tell samples apart, but
// otherwise even, are replaced by even spacing, and flagged.
func (t *trace) timing(n int) error {
	if t.Times == nil {
		t.cell = t.Interval
		if bad(t.Interval) || t.Interval < 0 || math.IsNaN(t.Start) || math.IsInf(t.Start, 0) {
			return errScale
		}
		return nil
	}
	if len(t.Times) != n {
		return fmt.Errorf("%d time stamps for %d samples", len(t.Times), n)
	}
	span := t.Times[n-1] - t.Times[0]
	even := span / float64(n-1)
	if bad(span) || span < 0 {
		return fmt.Errorf("time stamps span %g s", span)
	}
	var widest, worst, square float64
	same := 0
	for i := 1; i < n; i++ {
		d := t.Times[i] - t.Times[i-1]
		if d < 0 || math.IsNaN(d) {
			return fmt.Errorf("time stamp %d runs backwards: %g s after %g s", i+1, t.Times[i], t.Times[i-1])
		}
		if d == 0 {
			same++
		}
		widest = max(widest, d)
		worst = max(worst, math.Abs(t.Times[i]-t.Times[0]-float64(i)*even))
		square += d * d
	}
	t.cell = math.Sqrt(square / float64(n-1))
	t.judgeStamps(even, widest, worst, same)
	return nil
}

// judgeStamps settles whether the stamps are even, even but coarse, or uneven.
// Stamps printed with too few digits stay within one printed step of even spacing.
func (t *trace) judgeStamps(even, widest, worst float64, same int) {
	rounding := worst <= 1.01*max(widest, even) && (same > 0 || worst <= 0.51*even)
	if !rounding {
		t.flags = append(t.flags, Flag{UnevenTime, fmt.Sprintf("samples are not evenly spaced (up to %.3g s apart, %.3g s on average); each time stamp was used as it stands", widest, even)})
		if same > 0 {
			t.flags = append(t.flags, Flag{CoarseTime, fmt.Sprintf("%d time stamps repeat the one before; instants among them are uncertain", same)})
		}
		return
	}
	if worst > 0.02*even {
		t.flags = append(t.flags, Flag{CoarseTime, fmt.Sprintf("time stamps are rounded too coarsely for the sample interval; even spacing of %.6g s was taken", even)})
		// The two end stamps carry the rounding into the interval.
		step := max(widest-even, worst)
		n := float64(len(t.Times) - 1)
		t.TimeBaseU = math.Hypot(t.TimeBaseU, step/math.Sqrt(6)/(n*even))
	}
	t.Start, t.Interval, t.cell, t.Times = t.Times[0], even, even, nil
}

const finest = 60000 // codes over the range of samples that show no grid of their own

// quantise turns volts into codes: on their own grid when they lie on one, as
// captures of real converters do, else on one too fine to matter.
func (t *trace) quantise() error {
	low, high := math.Inf(1), math.Inf(-1)
	for i, v := range t.Volts {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("sample %d is %g V", i+1, v)
		}
		low, high = min(low, v), max(high, v)
	}
	var unseen float64
	if t.volt, unseen = grid(t.Volts, low, high); unseen > 0 {
		t.flags = append(t.flags, Flag{FewCodes, fmt.Sprintf("so few different values that the converter's step does not show: about %.2g V was supposed", unseen)})
	}
	t.printed = math.Hypot(t.Resolution, unseen) / t.volt / math.Sqrt(12)
	t.zero = low + 30000*t.volt
	t.codes = make([]int16, len(t.Volts))
	for i, v := range t.Volts {
		t.codes[i] = int16(math.Round((v - t.zero) / t.volt))
	}
	return nil
}
