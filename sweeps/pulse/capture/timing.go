package capture

import (
	"fmt"
	"math"

	"nightbench/sweeps/pulse"
)

// time gives a channel its times: by the stamps of column at, by the header's interval, or by neither.
func (t *table) time(c *Channel, at int) error {
	n := len(c.Record.Volts)
	dt, _, known := t.header.interval()
	if at < 0 {
		c.Record.Start, c.Record.Interval = t.header.start(), dt
		if !known {
			c.untimed(pulse.Flag{Name: pulse.TimeBase, Words: "the file does not say how far apart the samples are: duty and levels hold, durations cannot be told; a line like 'Increment,1e-6' above the samples would do"})
		}
		return nil
	}
	stamps, err := t.stamps(at, n)
	if err != nil {
		return err
	}
	span := stamps[n-1] - stamps[0]
	even := span / float64(n-1)
	step := coarseness(stamps, even)
	switch {
	case span == 0 && !known:
		c.untimed(pulse.Flag{Name: pulse.TimeBase, Words: "all time stamps are the same, rounded too coarsely to tell the sample interval: duty and levels hold, durations cannot be told; export more digits of the time"})
	case known && math.Abs(even-dt) <= 2*step/float64(n-1)+0.002*dt:
		// The stamps agree with the header's interval as well as they can: it is the finer of the two.
		c.Record.Start, c.Record.Interval = stamps[0], dt
		if step > 0.02*dt {
			c.Flags = append(c.Flags, pulse.Flag{Name: pulse.CoarseTime, Words: fmt.Sprintf("time stamps are rounded too coarsely to give the sample interval; the header's %.6g s was taken", dt)})
		}
	case known && span == 0:
		c.Record.Start, c.Record.Interval = stamps[0], dt
		c.Flags = append(c.Flags, pulse.Flag{Name: pulse.CoarseTime, Words: fmt.Sprintf("all time stamps are the same; the header's sample interval of %.6g s was taken", dt)})
	default:
		c.Record.Times = stamps
		if known {
			c.Record.Flags = append(c.Record.Flags, pulse.Flag{Name: pulse.TimeBase,
				Words: fmt.Sprintf("time stamps are %.6g s apart on average, the header says %.6g s; the stamps were taken", even, dt)})
		}
	}
	return nil
}

func (c *Channel) untimed(f pulse.Flag) {
	c.Untimed = true
	c.Record.Start, c.Record.Interval = 0, 1
	c.Record.Flags = append(c.Record.Flags, f)
}

// stamps are the first n times of a column, s.
func (t *table) stamps(at, n int) ([]float64, error) {
	all := t.values[at]
	if len(all) < n {
		return nil, &Error{Line: t.ended[at], What: fmt.Sprintf("%s ends before the samples do", t.title(at)), Do: "export again: the file is damaged"}
	}
	factor := t.units[at].factor
	if factor == 0 {
		factor = 1
		if s, ok := t.header["horizontalunits"]; ok {
			if u, ok := unitOf(s.text); ok && u.si == "s" {
				factor = u.factor
			}
		}
	}
	out := make([]float64, n)
	for i, x := range all[:n] {
		out[i] = x * factor
		if math.IsInf(x, 0) || i > 0 && !(out[i] >= out[i-1]) {
			return nil, &Error{Line: t.first + 1 + i, What: fmt.Sprintf("time runs backwards: %g s after %g s", out[i], out[max(0, i-1)]), Do: "export one record a file"}
		}
	}
	return out, nil
}

// coarseness is how far stamps depart from even spacing, s.
func coarseness(stamps []float64, even float64) float64 {
	var worst float64
	for i, s := range stamps {
		worst = max(worst, math.Abs(s-stamps[0]-float64(i)*even))
	}
	return worst
}
