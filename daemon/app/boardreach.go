package app

import (
	"context"
	"math"

	"nightbench/daemon/web"
	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// reach is what a board does over all the settings of its curves at one temperature.
type reach struct {
	curves      []web.BoardCurve
	oscillation web.BoardOscillation
	findings    []web.BoardFinding
	hardest     *web.BoardHardest
	done        bool
}

// reach computes it, or gives what was computed before. It looks at ctx between
// settings; curves that were finished when ctx ends are kept for the next who asks.
func (l *leaflet) reach(ctx context.Context, temperature float64) (*reach, error) {
	r := l.reaches[temperature]
	if r == nil {
		if len(l.reaches) >= reachesKept {
			clear(l.reaches)
		}
		r = &reach{}
		l.reaches[temperature] = r
	}
	if r.done {
		return r, nil
	}
	var all []predict.Setting
	for i, line := range l.lines(temperature) {
		all = append(all, line...)
		if i < len(r.curves) {
			continue
		}
		curve, swings, err := l.curve(ctx, line, r.oscillation)
		if err != nil {
			return nil, err
		}
		r.curves, r.oscillation = append(r.curves, curve), swings
	}
	if err := l.judge(r, all); err != nil {
		return nil, web.Fail(web.Invalid, err)
	}
	r.done = true
	return r, nil
}

// judge goes through the settings as if a plan visited them.
func (l *leaflet) judge(r *reach, all []predict.Setting) error {
	r.oscillation.Settings = len(all)
	findings, err := l.model.Judge(all)
	if err != nil {
		return err
	}
	r.findings = nil
	for _, f := range findings {
		r.findings = append(r.findings, web.BoardFinding{Name: f.Name, Refuse: f.Refuse, Words: f.Words, Setting: l.shown(f.Setting), Count: f.Count})
	}
	return l.harden(r, all)
}

// lines are the settings of each curve: along the pot at each supply, or along the supply.
func (l *leaflet) lines(temperature float64) [][]predict.Setting {
	at := func(supply, pot float64) predict.Setting {
		return predict.Setting{Supply: supply, Pot: pot, Temperature: temperature}
	}
	if !l.hasPot() {
		var line []predict.Setting
		for _, v := range evenly(l.supplies[0], l.supplies[len(l.supplies)-1]) {
			line = append(line, at(v, 0))
		}
		return [][]predict.Setting{line}
	}
	pots := spread(l.pots[0], l.pots[1])
	if l.board.Timing.Network == sweeps.Wiper {
		pots = evenly(l.pots[0], l.pots[1])
	}
	lines := make([][]predict.Setting, len(l.supplies))
	for i, v := range l.supplies {
		for _, p := range pots {
			lines[i] = append(lines[i], at(v, p))
		}
	}
	return lines
}

// evenly are as many settings as a curve has, from low to high.
func evenly(low, high float64) []float64 {
	all := make([]float64, curvePoints)
	for i := range all {
		all[i] = low + (high-low)*float64(i)/(curvePoints-1)
	}
	return all
}

// curve computes one line of settings, and adds to o where the board may not swing.
func (l *leaflet) curve(ctx context.Context, line []predict.Setting, o web.BoardOscillation) (web.BoardCurve, web.BoardOscillation, error) {
	c := web.BoardCurve{Quantities: map[sweeps.Quantity]sweeps.CurveOfQuantity{}}
	if l.hasPot() {
		c.Supply = &line[0].Supply
	}
	for k, s := range line {
		if err := ctx.Err(); err != nil {
			return c, o, err
		}
		x := s.Pot
		if !l.hasPot() {
			x = s.Supply
		}
		c.At = append(c.At, x)
		values, flags := l.ensemble.At(s)
		for q, p := range values {
			q, p := q, p
			of, ok := c.Quantities[q]
			if !ok {
				of = sweeps.CurveOfQuantity{Unit: p.Unit, Value: make([]*float64, len(line)), Low: make([]*float64, len(line)), High: make([]*float64, len(line))}
				c.Quantities[q] = of
			}
			of.Value[k], of.Low[k], of.High[k] = &p.Value, &p.Low, &p.High
		}
		_, swings := values[sweeps.Frequency]
		l.note(&o, s, swings, flags)
	}
	return c, o, nil
}

// note counts a setting at which the board, or one within tolerance, does not oscillate.
func (l *leaflet) note(o *web.BoardOscillation, s predict.Setting, swings bool, flags []sweeps.Flag) {
	for _, f := range flags {
		if f.Name != predict.NoOscillation {
			continue
		}
		if first := o.Never+o.Doubtful == 0; first || !swings && o.Never == 0 {
			at := l.shown(s)
			o.Words, o.At = f.Words, &at
		}
		if swings {
			o.Doubtful++
		} else {
			o.Never++
		}
		return
	}
}

// harden finds the stress nearest to its rating.
func (l *leaflet) harden(r *reach, all []predict.Setting) error {
	most := 0.0
	for _, s := range all {
		table, err := l.model.Stress(s)
		if err != nil {
			return err
		}
		for i, row := range table.Running {
			held := table.Locked[i]
			if share := math.Max(row.Share(), held.Share()); share > most {
				most = share
				r.hardest = &web.BoardHardest{Stress: stressOf(row, held), Held: held.Share() > row.Share(), Setting: l.shown(s)}
			}
		}
	}
	return nil
}

func stressOf(running, held predict.Stress) web.BoardStress {
	s := web.BoardStress{Part: running.Part, What: running.What, Unit: running.Unit, Running: running.Value, Held: held.Value}
	if running.Rating > 0 {
		rating, a, b := running.Rating, running.Share(), held.Share()
		s.Rating, s.RunningShare, s.HeldShare = &rating, &a, &b
	}
	return s
}
