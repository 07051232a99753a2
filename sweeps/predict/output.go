package predict

import (
	"fmt"
	"math"
	"sort"

	"gonum.org/v1/gonum/interp"

	"nightbench/sweeps"
)

// levels is an output table: voltage against current at each of several supply voltages.
type levels []levelCurve

type levelCurve struct {
	supply float64
	single float64 // the voltage where the table has one row
	fit    *interp.FritschButland
	end    float64 // A, last row: beyond it the last slope goes on
	slope  float64
	last   float64
	first  float64 // A, first row
}

// fitLevels fits a monotone cubic (PCHIP, Fritsch and Butland 1984) through each
// table of the part, or through the board's own rows where it has any.
func fitLevels(part []level, own []sweeps.CurrentVoltage) (levels, error) {
	if len(own) > 0 {
		l := level{}
		for _, r := range own {
			l.Rows = append(l.Rows, [2]float64{r.Current.SI(), r.Voltage.SI()})
		}
		part = []level{l}
	}
	var out levels
	for _, l := range part {
		c, err := fitLevel(l)
		if err != nil {
			return nil, fmt.Errorf("table at %g V: %w", l.Supply, err)
		}
		out = append(out, c)
	}
	sort.Slice(out, func(i, k int) bool { return out[i].supply < out[k].supply })
	return out, nil
}

func fitLevel(l level) (levelCurve, error) {
	if err := checkRows(l.Rows); err != nil {
		return levelCurve{}, err
	}
	n := len(l.Rows)
	last := l.Rows[n-1]
	c := levelCurve{supply: l.Supply, single: last[1], end: last[0], last: last[1], first: l.Rows[0][0]}
	if n == 1 {
		return c, nil
	}
	x, y := make([]float64, n), make([]float64, n)
	for i, r := range l.Rows {
		x[i], y[i] = r[0], r[1]
	}
	c.fit = new(interp.FritschButland)
	c.slope = (y[n-1] - y[n-2]) / (x[n-1] - x[n-2])
	return c, c.fit.Fit(x, y)
}

// at is the voltage and its slope at a current. Below the first row the first
// voltage holds; beyond the last row the last chord goes on.
func (c *levelCurve) at(i float64) (v, slope float64) {
	switch {
	case c.fit == nil:
		return c.single, 0
	case i > c.end:
		return c.last + c.slope*(i-c.end), c.slope
	case i < c.first:
		return c.fit.Predict(c.first), 0
	}
	return c.fit.Predict(i), c.fit.PredictDerivative(i)
}

// at interpolates linearly between the tables of two supplies; outside them the nearest holds.
func (l levels) at(i, supply float64) (v, slope float64) {
	if len(l) == 0 {
		return 0, 0
	}
	k := sort.Search(len(l), func(k int) bool { return l[k].supply >= supply })
	switch {
	case k == 0:
		return l[0].at(i)
	case k == len(l):
		return l[k-1].at(i)
	}
	v0, s0 := l[k-1].at(i)
	v1, s1 := l[k].at(i)
	f := (supply - l[k-1].supply) / (l[k].supply - l[k-1].supply)
	return v0 + f*(v1-v0), s0 + f*(s1-s0)
}

// output is the timer's pin 3 at one supply voltage.
type output struct {
	supply          float64
	drop, low       levels
	dropScale, lows float64
	shift           float64 // V added to the drop, from temperature
	bothWays        bool    // a MOS output, which conducts backwards at the resistance it has at no current
	pull            float64 // Ω of a resistor from the output to the supply, its load; 0: none
}

// high is the high level while i amperes are sourced, and the resistance it falls with. It never falls below ground.
func (o *output) high(i float64) (v, r float64) {
	d, s := o.drop.at(math.Max(i, 0), o.supply)
	d = math.Max(0, d*o.dropScale+o.shift) + o.back(i)*s*o.dropScale
	if d > o.supply {
		return 0, 0
	}
	return o.supply - d, s * o.dropScale
}

// sink is the low level while i amperes are sunk, and the resistance it rises with. It never rises above the supply.
func (o *output) sink(i float64) (v, r float64) {
	l, s := o.low.at(math.Max(i, 0), o.supply)
	if l = l*o.lows + o.back(i)*s*o.lows; l > o.supply {
		return o.supply, 0
	}
	return l, s * o.lows
}

// back is the part of a current that flows backwards and moves the level: none in
// a bipolar output, whose level at no current then holds.
func (o *output) back(i float64) float64 {
	if o.bothWays {
		return math.Min(i, 0)
	}
	return 0
}

// level is high or low at a current counted away from the output when high, into it when low.
func (o *output) level(isHigh bool, i float64) (v, r float64) {
	switch {
	case !isHigh:
		return o.sink(i)
	case o.pull > 0:
		return o.pulled(i)
	}
	return o.high(i)
}

// pulled is the high level with a load to the supply, which sources part of the
// current; all of it as long as that leaves the node above the output's own level.
func (o *output) pulled(i float64) (v, r float64) {
	own, _ := o.high(0)
	if all := o.supply - o.pull*i; !o.bothWays && all >= own {
		return all, o.pull
	}
	x := i
	for range 20 {
		v, r = o.high(x)
		step := (x + (o.supply-v)/o.pull - i) / (1 + r/o.pull)
		if x -= step; math.Abs(step) <= 1e-12 {
			break
		}
	}
	return v, r / (1 + r/o.pull)
}

// into solves the current that the high output, sourcing extra amperes besides,
// drives through r ohms into a junction of v volts to ground. At most 30 Newton steps.
func (o *output) into(r, v, extra float64) float64 {
	i := 0.0
	for range 30 {
		at, own := o.high(i + extra)
		next := max(0, i+(at-v-r*i)/(r+own))
		if diff := next - i; diff < 1e-12 && diff > -1e-12 {
			return next
		}
		i = next
	}
	return i
}
