package derive

import (
	"fmt"
	"math"
	"slices"

	"nightbench/instruments"
	"nightbench/sweeps"
	"nightbench/sweeps/pulse"
	"nightbench/sweeps/uncertainty"

	"gonum.org/v1/gonum/stat/distuv"
)

// view is one pair of nodes as the scope saw it, over all repeats.
type view struct {
	name    string // "scope ch 1"
	results []pulse.Result
	flags   []sweeps.Flag // why there is nothing to see
}

// analyse finds the channels that see the timer's output and the load, and takes their pulse parameters.
func (d *deriver) analyse() {
	none := func(what string) view {
		return view{name: "scope", flags: []sweeps.Flag{{Name: "no road", Words: "no scope channel of this bench looks at " + what}}}
	}
	d.timer, d.load = none("timer_out"), none("the load")
	if d.wiring.Scope == nil {
		return
	}
	vs := d.raw.SupplyVoltage()
	for _, c := range d.wiring.Scope.Channels {
		if c.Between[1] != instruments.NodeCommon {
			continue
		}
		switch {
		case c.Between[0] == instruments.NodeTimerOut:
			d.timer = d.view(c, vs, false)
			switch {
			case d.lowSide():
			case d.board.Load.ToSupply:
				d.load = d.view(c, vs, true) // the load stands between supply and timer_out
			default:
				d.load = d.timer // the load stands between timer_out and common
			}
		case c.Between[0] == instruments.NodeLoadLow && d.lowSide():
			d.load = d.view(c, vs, true)
		}
	}
	if len(d.timer.results) == 0 && len(d.load.results) > 0 {
		d.timer = d.load // a switched load has the timer's times
	}
}

// view analyses one channel of every record; against: as the voltage from the supply down to the node.
func (d *deriver) view(c instruments.ScopeChannelWiring, supply float64, against bool) view {
	v := view{name: fmt.Sprintf("scope ch %d", c.Number)}
	for _, channels := range d.raw.Records {
		for _, f := range channels {
			if f.Channel != c.Number {
				continue
			}
			r := record(v.name, f)
			if against {
				r = r.Against(supply)
			}
			half := supply / 2
			res, err := pulse.Analyse(r, pulse.Options{Threshold: &half, Expected: supply})
			if err != nil {
				v.flags = append(v.flags, sweeps.Flag{Name: "no record", Words: fmt.Sprintf("%s: %v", v.name, err)})
				continue
			}
			v.results = append(v.results, res)
		}
	}
	if len(v.results) == 0 && len(v.flags) == 0 {
		v.flags = append(v.flags, sweeps.Flag{Name: "no record", Words: v.name + " gave no record"})
	}
	return v
}

// record is a waveform as the pulse analysis takes it. The maker's limits of error are rectangular (GUM 4.3.7).
func record(name string, f instruments.Waveform) pulse.Record {
	return pulse.Record{
		Codes: f.Codes, Zero: f.VoltsAtZero, PerCode: f.VoltsPerCode, Start: f.Start, Interval: f.Interval,
		ClipLow: &f.ClipLow, ClipHigh: &f.ClipHigh, Instrument: name,
		GainU:     f.Accuracy.Reading / math.Sqrt(3),
		OffsetU:   (f.Accuracy.Range*f.FullScale + f.Accuracy.Offset) / math.Sqrt(3),
		TimeBaseU: f.TimeBase / math.Sqrt(3),
	}
}

// get is a quantity over all records: the mean, the causes the records share, and
// for the rest what each record claims, unless they scatter by more.
func (v view) get(q sweeps.Quantity) (uncertainty.Budget, bool) {
	var each []uncertainty.Budget
	for _, r := range v.results {
		if p, ok := r.Get(string(q)); ok {
			each = append(each, p.Budget)
		}
	}
	if len(each) == 0 || len(each) < len(v.results) {
		return uncertainty.Budget{}, false
	}
	return overRepeats(each), true
}

func overRepeats(each []uncertainty.Budget) uncertainty.Budget {
	if len(each) == 1 {
		return each[0]
	}
	values := make([]float64, len(each))
	claimed := uncertainty.Budget{} // of the mean: what the records do not share
	for i, b := range each {
		values[i] = b.X
		for _, c := range b.Components {
			if c.Key == "" {
				claimed = claimed.Add(c.Times(1 / float64(len(each))))
			}
		}
	}
	seen, err := uncertainty.Repeats(values)
	if err != nil {
		return each[0]
	}
	own := uncertainty.Scatter("scatter of records", seen)
	if !exceeds(seen, claimed.U()) {
		own = uncertainty.Scatter("scatter within records", uncertainty.Value{U: claimed.U(), DOF: claimed.DOF()})
	}
	out := uncertainty.New(seen.X, own)
	for _, c := range each[0].Components {
		if c.Key != "" {
			out = out.Add(c)
		}
	}
	return out
}

// exceeds tells whether repeats scatter more than the records by themselves explain:
// by chance one in ten would (χ² test of a variance against a known one). Taking
// the larger of the two always would cover too much, the scatter of few being a poor guide.
func exceeds(seen uncertainty.Value, claimed float64) bool {
	if claimed == 0 {
		return true
	}
	ratio := seen.U / claimed
	return ratio*ratio*seen.DOF > distuv.ChiSquared{K: seen.DOF}.Quantile(0.9)
}

// road is the view's way to q.
func (v view) road(q sweeps.Quantity) road {
	r := road{name: v.name, flags: slices.Clone(v.flags)}
	b, ok := v.get(q)
	if !ok {
		r.flags = append(r.flags, v.why(q)...)
		return r
	}
	r.budget, r.ok = b, true
	r.flags = append(r.flags, v.about(q)...)
	return r
}

// about are the flags that bear on q, each once.
func (v view) about(q sweeps.Quantity) []sweeps.Flag {
	var flags []sweeps.Flag
	seen := map[string]bool{}
	for _, res := range v.results {
		p, _ := res.Get(string(q))
		for _, f := range p.Flags {
			if !seen[f.Name] {
				seen[f.Name] = true
				flags = append(flags, sweeps.Flag{Name: f.Name, Words: v.name + ": " + f.Words})
			}
		}
	}
	return flags
}

// why says why the records have no q: what the wave is, and its flags.
func (v view) why(q sweeps.Quantity) []sweeps.Flag {
	var flags []sweeps.Flag
	seen := map[string]bool{}
	for _, res := range v.results {
		if _, ok := res.Get(string(q)); ok {
			continue
		}
		for _, f := range res.Flags {
			if !seen[f.Name] {
				seen[f.Name] = true
				flags = append(flags, sweeps.Flag{Name: f.Name, Words: v.name + ": " + f.Words})
			}
		}
		if c := string(res.Class); !seen[c] {
			seen[c] = true
			flags = append(flags, sweeps.Flag{Name: c, Words: fmt.Sprintf("%s sees a wave that is %s: it has no %s", v.name, c, q)})
		}
	}
	return flags
}
