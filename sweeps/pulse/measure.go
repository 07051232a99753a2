package pulse

import (
	"math"

	"nightbench/sweeps/uncertainty"
)

// measure fills in the parameters of a record with at least one whole period.
func (a *analysis) measure() {
	c := a.cycles()
	a.result.Periods = c.n()
	a.result.Class = TwoLevel
	if a.three {
		a.result.Class = FreewheelRest
	}
	sag := a.sag(c)
	a.judgePeriods(c)
	if sag == 0 {
		a.secondLevels()
	}
	a.timing(c)
	average, rms := a.wholePeriodMeans(c)
	a.add(average)
	a.levels(sag)
	a.add(rms)
	a.add(a.ripple())
	a.transitions(c)
	a.aberrations()
	if a.three {
		a.freewheelAndRest(c)
	}
	a.attach()
}

// judgePeriods flags too few, irregular or undersampled periods.
func (a *analysis) judgePeriods(c cycles) {
	if c.n() < 2 {
		a.flag(FewPeriods, "one whole period only: nothing tells whether the next is the same; take a longer record")
	}
	high, low, whole := c.durations()
	shortest := min(median(high), median(low)) / a.cell
	if shortest < 2.5 {
		a.flag(Undersampled, "the shorter phase lasts about %.1f sample intervals; take a faster time base", shortest)
	}
	a.judgeSettling()
	if a.high.n < 4 || a.low.n < 4 || a.pairs < 6 {
		a.flag(FewSamples, "only %d samples in the high and %d in the low state; noise is poorly known", a.high.n, a.low.n)
	}
	spread := deviation(whole) / mean(whole)
	if spread > 0.25 && c.n() >= 3 {
		a.flag(Irregular, "periods scatter by %.0f %%: pulses are missing, or it is no steady pulse train", 100*spread)
	}
	if spread > 0.5 && c.n() >= 4 {
		a.result.Class = NotPulses
	}
}

// judgeSettling flags levels that are not one level.
func (a *analysis) judgeSettling() {
	w := a.high.level - a.low.level
	for _, s := range []state{a.high, a.low} {
		moving := s.spread-s.noise > sq(0.08*w) || s.uSettle > 0.03*w ||
			math.Abs(s.droop) > 0.012*w && math.Abs(s.droop) > 5*s.uDroop
		stepped := math.Abs(s.shelf) > 0.04*w && math.Abs(s.shelf) > 5*s.uShelf
		if (moving || stepped) && !a.result.Flagged(Sagging) {
			a.flag(Unsettled, "a level still moves through its state (by about %.2g V): it and the instants at half level are doubtful", max(2*math.Sqrt(s.spread), math.Abs(s.shelf))*a.volt)
		}
	}
}

// sag tells by how much (codes) the high level falls through its state; 0 when not significantly.
func (a *analysis) sag(c cycles) float64 {
	amplitude := a.high.level - a.low.level
	// Halves of the last three fifths are 0.3 of the state apart.
	fall := a.high.droop / 0.3
	if fall < 0.03*amplitude || a.high.droop < 5*a.high.uDroop || fall < 2*a.q {
		return 0
	}
	a.flag(Sagging, "the high level falls by about %.3g V through the high state; the level given is its mean, and no drop can be had from average and duty", fall*a.volt)
	a.result.Class = SaggingTop
	return fall
}

// levels adds high and low level and the amplitude.
func (a *analysis) levels(sag float64) {
	own := func(s state, sign float64) []uncertainty.Component {
		return []uncertainty.Component{
			uncertainty.Scatter("noise", uncertainty.Value{U: a.volt * s.uRandom, DOF: s.dof}).Times(sign),
			uncertainty.Known("converter steps", a.volt*s.uRound).Times(sign),
			uncertainty.Known("settling", a.volt*s.uSettle).Times(sign),
		}
	}
	if sag > 0 {
		a.high.uSettle = sag / math.Sqrt(12)
	}
	high := a.voltage("high_level", a.high.level, own(a.high, 1)...)
	low := a.voltage("low_level", a.low.level, own(a.low, 1)...)
	a.add(high)
	a.add(low)
	swing := (a.high.level - a.low.level) * a.volt
	a.add(a.quantity("amplitude", "V", swing, 0, swing, 0, append(own(a.high, 1), own(a.low, -1)...)...))
}

// ripple is the slow variation of the high level, peak to peak of the sine of the
// same rms value: what the samples of the settled high state spread more than neighbours do.
func (a *analysis) ripple() Quantity {
	s := a.high
	noise := s.fine
	if s.pairs < 30 {
		noise = s.noise // pooled with other states
	}
	slow := s.spread - noise
	n := float64(max(2, s.n))
	// Variance less half the mean square of differences is the mean product of neighbours, which of
	// n white samples scatters by 1/√n of the variance (von Neumann 1941); (4²+1)/9 of that with those
	// two apart. A slow part beats with the noise, and each occurrence sees its cycles only in part.
	uv := math.Sqrt(noise*(1.9*noise+4*max(0, slow))/n) + sq(s.coarse) + 3*sq(s.uSettle) + 0.2*max(0, slow)/math.Sqrt(float64(max(1, min(len(s.occ), mostSpans))))
	rms, u := root(slow, uv)
	k := 2 * math.Sqrt2 * a.volt
	return a.quantity("ripple", "V", k*rms, 0, k*rms, 0,
		uncertainty.Scatter("few samples", uncertainty.Value{U: k * u, DOF: max(1, n-1)}))
}

// transitions adds rise and fall time (first and second transition durations, 10 %
// to 90 %) where the samples resolve them.
func (a *analysis) transitions(c cycles) {
	for _, d := range []struct {
		name, words string
		rising      bool
	}{{"rise_time", "rising", true}, {"fall_time", "falling", false}} {
		m := a.modelInstants(&a.driven, d.rising)
		if m.n == 0 {
			continue
		}
		tau := m.duration / a.cell
		if tau < 3 || a.driven.bound > 0.09*(a.driven.high-a.driven.low) {
			a.flag(EdgeTooFast, "transitions have fewer than three samples between 10 %% and 90 %%: only their durations are lost (below about %.2g s); instants keep their place within a sample", 3*a.cell)
			continue
		}
		a.add(a.transition(d.name, d.rising, m))
	}
}

func (a *analysis) transition(name string, rising bool, m instantModel) Quantity {
	var values []float64
	for _, e := range a.driven.edges {
		if e.rising == rising {
			values = append(values, math.Abs(a.at(e.ninth)-a.at(e.tenth)))
		}
	}
	n := float64(len(values))
	x := mean(values)
	w := a.driven.high - a.driven.low
	// An exponential transition is at its end a fifth as steep as at the middle, a straight one as
	// steep; in between for noise (a half) and for the converter's steps (0.4, hence 2.5).
	noise := (crossingVariance(math.Sqrt(a.noise)/(0.5*m.slope*a.cell)) + crossingVariance(math.Sqrt(a.noise)/(m.slope*a.cell))) * sq(a.cell)
	level := x * math.Hypot(a.uLevel(a.high), a.uLevel(a.low)) / w
	tau := x / a.cell
	// Straight lines between samples cut the bends at the 10 % and 90 % levels short, so the duration
	// comes out long: by 0.55/τ samples for a symmetric transition, 0.7/τ for an exponential one, nothing for
	// a straight one (simulated). How steep the middle is tells which: its steepness times the
	// duration is 0.8 of the amplitude for a straight transition, 1.02 for a Gaussian, 1.10 for an exponential one.
	bend := min(0.75, max(0, 2.4*(m.slope*x/w-0.8))) * a.cell / tau
	x -= bend
	e := scatterBeyond(values, noise+sq(0.5*a.cell/tau))
	return a.quantity(name, "s", x, 0, 0, x,
		uncertainty.Scatter("noise", uncertainty.Value{U: math.Sqrt(noise / n), DOF: max(1, float64(a.pairs-1))}),
		uncertainty.Known("bend of transitions", 0.3*bend+0.13*a.cell/tau),
		uncertainty.Known("converter steps", 2.5*a.q/math.Sqrt(12)/m.slope),
		uncertainty.Known("state levels", level),
		uncertainty.Scatter("scatter of transitions", uncertainty.Value{U: e.mean, DOF: e.dof}))
}

// freewheelAndRest adds the rest level, which is the motor's back-EMF, and the share of
// the period in which current flows.
func (a *analysis) freewheelAndRest(c cycles) {
	s := a.rest
	a.add(a.voltage("back_emf", s.level,
		uncertainty.Scatter("noise", uncertainty.Value{U: a.volt * s.uRandom, DOF: s.dof}),
		uncertainty.Known("converter steps", a.volt*s.uRound),
		uncertainty.Known("settling", a.volt*s.uSettle)))

	if !c.rising {
		return
	}
	end := a.modelInstants(&a.freewheel, true)
	ends := risings(a.freewheel.edges)
	var flow []float64
	k := 0
	for i := range c.n() {
		for k < len(ends) && a.at(ends[k].mid) <= c.bounds[i] {
			k++
		}
		if k < len(ends) && a.at(ends[k].mid) < c.bounds[i+1] {
			flow = append(flow, (a.at(ends[k].mid)-c.bounds[i])/(c.bounds[i+1]-c.bounds[i]))
		}
	}
	if len(flow) == 0 {
		return
	}
	n := float64(len(flow))
	x := mean(flow)
	grid := c.keep*(c.limit.grid+end.grid) + 2*(x*x-x)*c.limit.grid/(n*n)
	noise := (c.limit.noise+end.noise)/n + 2*(x*x-x)*c.limit.noise/(n*n)
	level := math.Hypot(a.uLevel(a.low)/end.slope, a.uLevel(a.high)/c.limit.slope) / 2
	level = math.Hypot(level, a.uLevel(a.rest)/2*(1/end.slope+1/c.limit.slope))
	e := scatterBeyond(flow, (c.limit.noise+end.noise+(c.limit.grid+end.grid)*(1-c.keep+1/n))*(1+2*x*x)/sq(c.period))
	a.add(a.quantity("conduction", "1", x, 0, 0, 0,
		uncertainty.Known("sample interval", math.Sqrt(max(0, grid))/c.period),
		uncertainty.Scatter("noise", uncertainty.Value{U: math.Sqrt(max(0, noise)) / c.period, DOF: max(1, float64(a.pairs-1))}),
		uncertainty.Known("state levels", level/c.period),
		uncertainty.Known("bend of transitions", bendBetween(end, c.limit)/c.period),
		uncertainty.Scatter("scatter of periods", uncertainty.Value{U: e.mean, DOF: e.dof})))
}

// bears says which quantities a flag bears on; flags not listed bear on all.
var bears = map[string][]string{
	EdgeTooFast:    {"overshoot", "undershoot"}, // what lies between samples is not seen
	Clipped:        {"average_voltage", "high_level", "low_level", "amplitude", "rms", "ripple", "overshoot", "undershoot", "back_emf"},
	Sagging:        {"high_level", "amplitude", "ripple"},
	FewCodes:       {"average_voltage", "high_level", "low_level", "amplitude", "rms", "ripple", "overshoot", "undershoot", "back_emf"},
	Scale:          {"average_voltage", "high_level", "low_level", "amplitude", "rms", "ripple", "back_emf"},
	Unsettled:      {"duty", "t_high", "t_low", "high_level", "low_level", "amplitude", "ripple", "rise_time", "fall_time", "overshoot", "undershoot", "back_emf", "conduction"},
	ThirdLevel:     {"duty", "t_high", "t_low", "high_level", "low_level", "amplitude", "ripple", "overshoot", "undershoot", "conduction"},
	FastRinging:    {"overshoot", "undershoot"},
	LevelsDisagree: {"duty", "t_high", "t_low", "high_level", "low_level", "amplitude", "ripple", "overshoot", "undershoot", "rise_time", "fall_time"},
	TimeBase:       {"frequency", "period", "t_high", "t_low", "rise_time", "fall_time", "jitter"},
	CoarseTime:     {"duty", "frequency", "period", "t_high", "t_low", "rise_time", "fall_time", "jitter", "conduction"},
}

// attach puts the record's flags on the quantities they bear on.
func (a *analysis) attach() {
	for i := range a.result.Quantities {
		q := &a.result.Quantities[i]
		for _, f := range a.result.Flags {
			names, listed := bears[f.Name]
			if !listed || contains(names, q.Name) {
				q.Flags = append(q.Flags, f)
			}
		}
	}
}
