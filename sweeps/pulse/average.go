package pulse

import (
	"math"
	"slices"

	"nightbench/sweeps/uncertainty"
)

// wholePeriodMeans returns mean and rms value over the whole periods, by the
// trapezoidal rule between the interpolated ends.
func (a *analysis) wholePeriodMeans(c cycles) (average, rms Quantity) {
	start, end := c.first.mid, c.last.mid
	ref := (a.driven.low + a.driven.high) / 2
	sum, square := a.integrate(start, end, ref)
	m, s := sum, math.Sqrt(max(0, a.volt*a.volt*square+2*a.volt*sum*a.volts(0)+sq(a.volts(0))))

	grid, noise := a.meanErrors(c)
	n := math.Max(1, end-start)
	scatter := math.Sqrt(a.noise / n)
	parts := a.parts(c)
	var round, unlike, moved, squareRound float64
	for _, p := range parts {
		round = math.Hypot(round, p.share*p.uRound)
		squareRound = math.Hypot(squareRound, p.share*p.uRound*a.volts(p.level))
		if a.resolved {
			m += p.share * p.shift
			moved += p.share * p.shift * a.volts(p.level)
			unlike = math.Hypot(unlike, p.share*p.unlike(p.share*n))
		}
	}
	if a.resolved {
		scatter = unlike // the shifts are known from the settled samples, the mean is of all
	}
	dof := max(1, float64(a.pairs-1))
	average = a.voltage("average_voltage", m,
		c.sampling(a.volt*grid),
		uncertainty.Scatter("noise", uncertainty.Value{U: a.volt * math.Hypot(scatter, noise), DOF: dof}),
		uncertainty.Known("converter steps", a.volt*round),
		a.periodScatter(c))

	// Noise adds its power to the square; half of it is doubtful, being perhaps the board's own.
	power := a.noise * a.volt * a.volt
	s = math.Sqrt(max(0, s*s+2*a.volt*moved))
	s = math.Sqrt(max(0, s*s-power))
	floor := max(s, 1e-3*a.volt)
	high, low := a.volts(a.high.level), a.volts(a.low.level)
	swing := math.Abs(high*high-low*low) / (2 * floor) / max(math.Abs(high-low), 1e-300)
	rms = a.quantity("rms", "V", s, a.volts(m)/floor, (sq(s)-a.pivot*a.volts(m))/floor, 0,
		c.sampling(a.volt*grid*swing),
		uncertainty.Scatter("noise", uncertainty.Value{U: a.volt * math.Hypot(scatter, noise*swing), DOF: dof}),
		uncertainty.Known("converter steps", a.volt*squareRound/floor),
		uncertainty.Known("noise power", power/(2*floor)/math.Sqrt(3)))
	return average, rms
}

// part is a state and its share of the time.
type part struct {
	*state
	share float64
}

// parts are the states of the whole periods.
func (a *analysis) parts(c cycles) []part {
	share := a.highShare(c)
	if !a.three {
		return []part{{&a.high, share}, {&a.low, 1 - share}}
	}
	low, rest := a.low.length(), a.rest.length()
	return []part{{&a.high, share}, {&a.low, (1 - share) * low / (low + rest)}, {&a.rest, (1 - share) * rest / (low + rest)}}
}

// length is how many samples the occurrences of a state last.
func (st *state) length() (n float64) {
	for _, o := range st.occ {
		n += float64(o.to - o.from + 1)
	}
	return n
}

// unlike is the standard uncertainty (codes) of the mean of n samples of a state from that of the settled ones among them.
func (st *state) unlike(n float64) float64 {
	return math.Sqrt(st.spread * max(0, 1/float64(max(1, st.n))-1/max(1, n)))
}

// highShare is the share of the whole periods spent in the driven state.
func (a *analysis) highShare(c cycles) float64 {
	high, _, _ := c.durations()
	return mean(high) / c.period
}

// meanErrors returns the standard uncertainties (codes) of the mean from sample
// interval and noise of the instants: every transition misplaced by e adds e × its height.
func (a *analysis) meanErrors(c cycles) (grid, noise float64) {
	n, p := float64(c.n()), c.period
	type step struct {
		height float64
		m      instantModel
	}
	steps := []step{{a.driven.high - a.driven.low, c.limit}, {a.driven.high - a.driven.low, c.middle}}
	if a.three {
		steps[1].height = a.driven.high - a.freewheel.low
		steps = append(steps, step{a.freewheel.high - a.freewheel.low, a.modelInstants(&a.freewheel, true)})
	}
	var g float64
	for _, s := range steps {
		g += sq(s.height) * s.m.grid
	}
	share := a.highShare(c)
	ends := 2 * (share*share - share) * sq(steps[0].height) / (n * n)
	g = max(0, c.keep*g+ends*c.limit.grid)
	// Noise moves instants but hardly the area; only the two ends of the whole periods feel it.
	e := 2 * sq(steps[0].height) * c.limit.noise * (share*share + sq(1-share)) / (n * n) / 2
	return math.Sqrt(g) / p, math.Sqrt(e) / p
}

// periodScatter is what jitter of the board adds to the mean, through the duty.
func (a *analysis) periodScatter(c cycles) uncertainty.Component {
	high, _, whole := c.durations()
	ratios := make([]float64, len(high))
	for i := range high {
		ratios[i] = high[i] / whole[i]
	}
	n := float64(c.n())
	one := (c.limit.noise + c.middle.noise + (c.limit.grid+c.middle.grid)*(1-c.keep+1/n)) * 3 / sq(c.period)
	e := scatterBeyond(ratios, one)
	return uncertainty.Scatter("scatter of periods", uncertainty.Value{U: a.volt * e.mean * (a.high.level - a.low.level), DOF: e.dof})
}

// integrate returns the mean, in codes, and the mean square, in codes², between two
// fractional sample indices at which the waveform passes the code ref.
func (a *analysis) integrate(start, end, ref float64) (avg, square float64) {
	if a.Times != nil {
		return a.integrateUneven(start, end, ref)
	}
	from, to := int(start)+1, int(end)
	// The sums over all samples are in the histogram; take off what lies outside.
	var s, ss float64
	for i, k := range a.h.count {
		y := float64(a.h.low+i) - ref
		s += float64(k) * y
		ss += float64(k) * y * y
	}
	for _, part := range [][]int16{a.codes[:from], a.codes[to+1:]} {
		for _, c := range part {
			y := float64(c) - ref
			s -= y
			ss -= y * y
		}
	}
	y0, y1 := float64(a.codes[from])-ref, float64(a.codes[to])-ref
	lead, trail := float64(from)-start, end-float64(to)
	s += y0*(lead-1)/2 + y1*(trail-1)/2
	ss += y0*y0*(lead/3-0.5) + y1*y1*(trail/3-0.5)
	return finish(s/(end-start), ss/(end-start), ref)
}

// integrateUneven is integrate by the time stamps themselves.
func (a *analysis) integrateUneven(start, end, ref float64) (avg, square float64) {
	from, to := int(start)+1, int(end)
	var s, ss float64
	t, y := a.at(start), 0.0
	step := func(nextT, nextY float64) {
		d := nextT - t
		s += d * (y + nextY) / 2
		ss += d * (y*y + nextY*nextY) / 2
		t, y = nextT, nextY
	}
	for i := from; i <= to; i++ {
		step(a.Times[i], float64(a.codes[i])-ref)
	}
	step(a.at(end), 0)
	span := a.at(end) - a.at(start)
	return finish(s/span, ss/span, ref)
}

// finish moves mean and mean square about ref to those about code 0.
func finish(s, ss, ref float64) (avg, square float64) {
	return s + ref, ss + 2*ref*s + ref*ref
}

func median(values []float64) float64 {
	s := slices.Clone(values)
	slices.Sort(s)
	return s[len(s)/2]
}

func deviation(values []float64) float64 {
	if len(values) < 2 {
		return 0
	}
	m := mean(values)
	var v float64
	for _, x := range values {
		v += sq(x - m)
	}
	return math.Sqrt(v / float64(len(values)-1))
}

func contains(names []string, name string) bool { return slices.Contains(names, name) }
