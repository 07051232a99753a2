package pulse

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
	"nightbench/sweeps/uncertainty"
)

// cycles are the whole periods of a record: boundaries at transitions of one
// polarity, and between each two the opposite transition. Times in s.
type cycles struct {
	first, last edge // the transitions that bound the whole periods
	bounds      []float64
	inner       []float64
	rising      bool // the boundaries are rising transitions
	period      float64
	fitted      float64 // s, period by least squares, for the phases only
	limit       instantModel
	middle      instantModel
	keep        float64 // coherence of the sampling errors
	dof         float64 // degrees of freedom of what is put down to sampling
}

func (a *analysis) cycles() cycles {
	edges := a.driven.edges
	last := (len(edges) - 1) / 2 * 2
	c := cycles{rising: edges[0].rising, first: edges[0], last: edges[last]}
	if a.three && !c.rising && len(edges) >= 4 {
		// Rest comes before the rising transition: begin there.
		edges = edges[1:]
		last = (len(edges) - 1) / 2 * 2
		c = cycles{rising: true, first: edges[0], last: edges[last]}
	}
	for k := 0; k <= last; k++ {
		t := a.at(edges[k].mid)
		if k%2 == 0 {
			c.bounds = append(c.bounds, t)
		} else {
			c.inner = append(c.inner, t)
		}
	}
	c.limit = a.modelInstants(&a.driven, c.rising)
	c.middle = a.modelInstants(&a.driven, !c.rising)
	c.period = (c.bounds[c.n()] - c.bounds[0]) / float64(c.n())
	c.phases(a.cell)
	return c
}

func (c *cycles) n() int { return len(c.inner) }

// phases fits a straight line to all instants to learn how their places between
// samples wander, and from that how far sampling errors average out.
func (c *cycles) phases(cell float64) {
	c.fitted, c.keep, c.dof = c.period, 1, math.Inf(1)
	n := float64(c.n())
	if n < 2 {
		return
	}
	var up, down float64
	for _, ts := range [][]float64{c.bounds, c.inner} {
		m := float64(len(ts)-1) / 2
		for k, t := range ts {
			x := float64(k) - m
			up += x * (t - ts[0])
			down += x * x
		}
	}
	c.fitted = up / down
	ends, endRange := c.residual(c.bounds)
	insides, insideRange := c.residual(c.inner)
	variance := (ends + insides) / (2*n - 2)
	// Scatter up to that of transitions faster than a sample is put down to sampling,
	// what goes beyond to jitter.
	most := sq(cell) / 12
	jitter := math.Sqrt(max(0, variance-most)) / cell
	// Instants that keep their place scatter less than they err: hence the factor, set by simulation.
	u := 1.4 * math.Sqrt(max(c.limit.grid, variance)/down) / cell
	c.keep = coherence(c.fitted/cell, c.n(), u, jitter)
	c.limit.sampled(cell, 1/c.keep)
	c.middle.sampled(cell, 1/c.keep)
	noise := math.Sqrt(max(c.limit.noise, c.middle.noise))
	switch {
	case n < 8 && variance-sq(noise) > 2.5*max(c.limit.grid, c.middle.grid)*(1-c.keep),
		endRange > c.limit.widest(cell)+4*noise || insideRange > c.middle.widest(cell)+4*noise:
		c.keep, c.dof = max(c.keep, 1/n), 2*n-2
		c.limit.shaken(variance)
		c.middle.shaken(variance)
	case n >= 8 && c.keep < 0.5:
		c.limit.seen(ends/(n-0.5), most, c.keep)
		c.middle.seen(insides/(n-1.5), most, c.keep)
	}
}

// sampling is the component of the sample interval: known, or told by the instants' own scatter.
func (c *cycles) sampling(u float64) uncertainty.Component {
	k := uncertainty.Known("sample interval", u)
	if !math.IsInf(c.dof, 1) {
		k = uncertainty.Scatter("sample interval and jitter", uncertainty.Value{U: u, DOF: c.dof})
	}
	return k
}

// residual is the sum of squares of what the fitted period leaves of the instants, and its range.
func (c *cycles) residual(instants []float64) (squares, span float64) {
	var s, ss, low, high float64
	for k, t := range instants {
		d := t - instants[0] - float64(k)*c.fitted
		low, high = min(low, d), max(high, d)
		s += d
		ss += d * d
	}
	return ss - s*s/float64(len(instants)), high - low
}

// durations returns, period by period, how long the high state, the low state and the whole lasted.
func (c *cycles) durations() (high, low, whole []float64) {
	high, low, whole = make([]float64, c.n()), make([]float64, c.n()), make([]float64, c.n())
	for i, t := range c.inner {
		high[i], low[i] = t-c.bounds[i], c.bounds[i+1]-t
		whole[i] = high[i] + low[i]
	}
	if !c.rising {
		high, low = low, high
	}
	return high, low, whole
}

// excess is the scatter of per-period values beyond what the instants' errors explain.
type excess struct {
	mean   float64 // standard uncertainty it gives the mean of all periods
	single float64 // variance of one period
	dof    float64
}

// scatterBeyond compares the values' variance with the variance expected of one
// value; only a significant excess counts (2 % one-sided, chi-square). Successive values
// that undo each other, as periods do when only the instants jitter, average out faster.
func scatterBeyond(values []float64, expected float64) excess {
	n := float64(len(values))
	none := excess{dof: math.Inf(1)}
	if n < 2 {
		return none
	}
	var mean, g0, g1 float64
	for _, v := range values {
		mean += v / n
	}
	for i, v := range values {
		g0 += sq(v-mean) / (n - 1)
		if i > 0 {
			g1 += (v - mean) * (values[i-1] - mean) / (n - 1)
		}
	}
	chance := distuv.ChiSquared{K: n - 1}.Quantile(0.98) / (n - 1)
	if g0 <= expected*chance {
		return none
	}
	e := excess{single: g0 - expected, dof: n - 1}
	of := e.single
	if n >= 8 && g1 < 0 {
		of = max(e.single/n, e.single+2*g1)
	}
	e.mean = math.Sqrt(of / n)
	return e
}

// timing adds duty, frequency, period and the two durations.
func (a *analysis) timing(c cycles) {
	high, low, whole := c.durations()
	n := float64(c.n())
	b, m := c.limit, c.middle
	grid := c.keep * (b.grid + m.grid)
	noise := (b.noise + m.noise) / n
	// An error of the 50 % level moves rising and falling instants apart.
	level := math.Hypot(a.uLevel(a.low), a.uLevel(a.high)) / 2 * (1/b.slope + 1/m.slope)
	bend := bendBetween(b, m)
	one := b.noise + m.noise + (b.grid+m.grid)*(1-c.keep+1/n)
	scatter := func(e excess) uncertainty.Component {
		return uncertainty.Scatter("scatter of periods", uncertainty.Value{U: e.mean, DOF: e.dof})
	}
	dof := max(1, float64(a.pairs-1))
	state := func(name string, values []float64) Quantity {
		return a.quantity(name, "s", mean(values), 0, 0, mean(values),
			c.sampling(math.Sqrt(grid)),
			uncertainty.Scatter("noise", uncertainty.Value{U: math.Sqrt(noise), DOF: dof}),
			uncertainty.Known("state levels", level), uncertainty.Known("bend of transitions", bend),
			scatter(scatterBeyond(values, one)))
	}
	tHigh, tLow := state("t_high", high), state("t_low", low)

	period := a.quantity("period", "s", c.period, 0, 0, c.period,
		c.sampling(math.Sqrt(2*b.grid)/n),
		uncertainty.Scatter("noise", uncertainty.Value{U: math.Sqrt(2*b.noise) / n, DOF: dof}),
		scatter(scatterBeyond(whole, 2*b.noise+2*b.grid)))
	frequency := period
	frequency.Name, frequency.Unit = "frequency", "Hz"
	frequency.Budget = uncertainty.Linear([]float64{-1 / sq(c.period)}, period.Budget)
	frequency.X = 1 / c.period

	a.add(a.duty(c, high, whole, level, bend, dof))
	a.add(frequency)
	a.add(period)
	a.add(tHigh)
	a.add(tLow)
	if c.n() >= 2 {
		a.add(a.jitter(c, whole))
	}
}

// duty is the share of the high state in the whole periods. The boundaries' errors
// enter both parts, so for one period u(D) = (u_t/T) √(2 − 2D + 2D²).
func (a *analysis) duty(c cycles, high, whole []float64, level, bend, dof float64) Quantity {
	n, p := float64(c.n()), c.period
	d := mean(high) / p
	share := d
	if !c.rising {
		share = 1 - d
	}
	ends := 2 * (share*share - share) / (n * n)
	b, m := c.limit, c.middle
	grid := math.Sqrt(max(0, c.keep*(b.grid+m.grid)+ends*b.grid)) / p
	noise := math.Sqrt(max(0, (b.noise+m.noise)/n+ends*b.noise)) / p
	ratios := make([]float64, len(high))
	for i := range high {
		ratios[i] = high[i] / whole[i]
	}
	one := (b.noise + m.noise + (b.grid+m.grid)*(1-c.keep+1/n)) * (1 + 2*share*share) / sq(p)
	e := scatterBeyond(ratios, one)
	return a.quantity("duty", "1", d, 0, 0, 0,
		c.sampling(grid),
		uncertainty.Scatter("noise", uncertainty.Value{U: noise, DOF: dof}),
		uncertainty.Known("state levels", level/p), uncertainty.Known("bend of transitions", bend/p),
		uncertainty.Scatter("scatter of periods", uncertainty.Value{U: e.mean, DOF: e.dof}))
}

// jitter is the standard deviation of the period, what the instants' own errors
// explain taken off.
func (a *analysis) jitter(c cycles, whole []float64) Quantity {
	n := float64(len(whole))
	own := 2*c.limit.noise + 2*c.limit.grid*(1-c.keep)
	var m, v float64
	m = mean(whole)
	for _, w := range whole {
		v += sq(w-m) / max(1, n-1)
	}
	// u of a variance is √(2/(n−1)) of it.
	// Jitter well below a sample does not show when all instants keep their place.
	uv := math.Sqrt(2/max(1, n-1))*max(v, own) + 0.5*own + 0.1*c.limit.grid
	x, u := root(v-own, uv)
	return a.quantity("jitter", "s", x, 0, 0, 0, uncertainty.Scatter("few periods", uncertainty.Value{U: u, DOF: math.Inf(1)})) // u allows for n itself
}

func mean(values []float64) float64 {
	var s float64
	for _, v := range values {
		s += v
	}
	return s / float64(len(values))
}

// uLevel is the standard uncertainty of a state level, codes, gain and offset aside.
func (a *analysis) uLevel(s state) float64 {
	return math.Sqrt(sq(s.uRandom) + sq(s.uRound) + sq(s.uSettle))
}
