package pulse

import (
	"math"

	"nightbench/sweeps/uncertainty"
)

// checkClipping flags samples at the ends of the converter's range.
func (a *analysis) checkClipping() {
	low, _ := a.h.within(math.MinInt16, float64(a.clipLow))
	high, _ := a.h.within(float64(a.clipHigh), math.MaxInt16)
	if low > 0 {
		a.flag(Clipped, "%d samples at the lower end of the converter's range: the low level is at or below %.4g V; move the trace or take a larger range", low, a.volts(float64(a.clipLow)))
	}
	if high > 0 {
		a.flag(Clipped, "%d samples at the upper end of the converter's range: the high level is at or above %.4g V; move the trace or take a larger range", high, a.volts(float64(a.clipHigh)))
	}
}

// judgeLevels flags what the levels alone tell: too little of the converter's
// range, a wrong scale.
func (a *analysis) judgeLevels() {
	amplitude := a.high.level - a.low.level
	if amplitude < 8*a.q {
		a.flag(FewCodes, "the waveform spans only %.0f steps of the converter; take a smaller range", amplitude/a.q)
	}
	if sigma := math.Sqrt(a.noise); sigma > 0.05*amplitude {
		a.flag(Noisy, "noise is %.0f %% of the amplitude; the values are uncertain", 100*sigma/amplitude)
	}
	if a.options.Expected == 0 {
		return
	}
	ratio := amplitude * a.volt / math.Abs(a.options.Expected)
	for _, factor := range []float64{1000, 100, 10, 0.1, 0.01, 0.001} {
		if r := ratio / factor; r > 0.6 && r < 1.6 {
			a.flag(Scale, "the amplitude is about %g times the %.3g V expected: is the probe factor right, on the probe and in the scope", factor, a.options.Expected)
		}
	}
}

// slow tells whether the waveform is mostly between its levels, as a sine or a
// triangle is: then it has no states.
func (a *analysis) slow() bool {
	if a.three {
		return false
	}
	w := a.high.level - a.low.level
	n, _ := a.h.within(a.low.level+0.25*w, a.high.level-0.25*w)
	return float64(n) > 0.28*float64(a.h.n)
}

func (a *analysis) notPulses() {
	a.result.Class = NotPulses
	switch {
	case len(a.driven.edges) < 3 && a.driven.codes != nil && !a.slow():
		a.flag(FewPeriods, "the record holds %d transitions, less than one whole period; take a longer record", len(a.driven.edges))
	default:
		a.flag(string(NotPulses), "the waveform has no two levels to which it keeps")
	}
	a.add(a.meanOfAll())
}

// constant reports a record that shows one level.
func (a *analysis) constant() {
	mean := a.meanOfAll()
	a.result.Class = Constant
	name := "level"
	if th := a.options.Threshold; th != nil {
		a.result.Class, name = ConstantLow, "low_level"
		if mean.X > *th {
			a.result.Class, name = ConstantHigh, "high_level"
		}
	}
	a.add(mean)
	mean.Name = name
	a.add(mean)
}

// meanOfAll is the mean of the whole record, for one that has no periods.
func (a *analysis) meanOfAll() Quantity {
	n, mean, variance := a.h.moments(float64(a.h.low), float64(a.h.high()))
	white := neighbourNoise(a.codes)
	near, _ := a.h.within(mean-a.q*0.999, mean+a.q*0.999)
	st := state{noise: white * white, n: n, outer: n - near}
	st.rounding(a.q)
	// What is slower than white noise does not average out over the record.
	slow := math.Sqrt(max(0, variance-white*white*(1+3*math.Sqrt(2/float64(n)))))
	return a.voltage("average_voltage", mean,
		uncertainty.Scatter("noise", uncertainty.Value{U: a.volt * math.Sqrt(variance/float64(n)), DOF: float64(n - 1)}),
		uncertainty.Known("slow variation", a.volt*slow/2),
		uncertainty.Known("converter steps", a.volt*st.uRound))
}

// add appends a quantity to the result.
func (a *analysis) add(q Quantity) { a.result.Quantities = append(a.result.Quantities, q) }

// voltage makes a quantity in volts of a level in codes: the record's own
// components, then gain and offset, which all voltages of the instrument share.
func (a *analysis) voltage(name string, code float64, own ...uncertainty.Component) Quantity {
	return a.quantity(name, "V", a.volts(code), 1, a.volts(code)-a.pivot, 0, own...)
}

// quantity makes a quantity that feels offset and gain (V) and the time base (own unit) as given.
func (a *analysis) quantity(name, unit string, x, offset, gain, timeBase float64, own ...uncertainty.Component) Quantity {
	q := Quantity{Name: name, Unit: unit, Budget: uncertainty.New(x)}
	for _, c := range own {
		if c.U > 0 {
			q.Components = append(q.Components, c)
		}
	}
	shared := func(what string, u, sensitivity float64) {
		if u > 0 && sensitivity != 0 {
			q.Components = append(q.Components, uncertainty.Known("scope "+what, u).Keyed(a.Instrument+" "+what).Times(sensitivity))
		}
	}
	shared("gain", a.GainU, gain)
	if a.turned {
		offset = -offset
	}
	shared("offset", a.OffsetU, offset)
	shared("time base", a.TimeBaseU, timeBase)
	return q
}
