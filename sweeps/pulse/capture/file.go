package capture

import (
	"fmt"
	"math"
	"strings"

	"nightbench/sweeps/pulse"
)

// role is what a column holds.
type role int

const (
	samples role = iota
	times
	counts // sample numbers
)

// file makes channels of the table.
func (t *table) file() (File, error) {
	roles := t.roles()
	t.borrowNames(roles)
	var f File
	at := -1 // the time column in force: the nearest to the left
	for i, r := range roles {
		switch r {
		case times:
			at = i
		case samples:
			c, err := t.channel(i, at)
			if err != nil {
				return f, err
			}
			if c.Name == "" {
				c.Name = fmt.Sprintf("channel %d", len(f.Channels)+1)
			}
			f.Channels = append(f.Channels, c)
		}
	}
	if len(f.Channels) == 0 {
		return f, &Error{Line: t.first + 1, What: "times, but no voltage beside them", Do: "export at least one channel"}
	}
	f.ReadAs = t.words(roles, f)
	return f, nil
}

func (t *table) roles() []role {
	roles := make([]role, len(t.cols))
	timed := false
	for i := range t.cols {
		switch {
		case isIndexWord(t.names[i]) && consecutive(t.values[i]) && t.units[i].si == "", isTimeWord(t.names[i]) && t.counted(i):
			roles[i] = counts
		case isTimeWord(t.names[i]) && t.units[i].si != "V" && t.units[i].si != "A" || t.units[i].si == "s":
			roles[i], timed = times, true
		case isIndexWord(t.names[i]) && i == 0 && rising(t.values[i]):
			roles[i], timed = times, true // an x axis that is no count
		}
	}
	if timed || len(roles) == 1 || roles[0] == counts || t.units[0].si != "" || isChannelWord(t.names[0]) || !rising(t.values[0]) {
		return roles
	}
	// The first column has no name that tells, but only ever rises.
	roles[0] = times
	if consecutive(t.values[0]) {
		roles[0] = counts
	}
	return roles
}

// counted tells a column called time that numbers the samples, the header giving their interval.
func (t *table) counted(i int) bool {
	dt, _, known := t.header.interval()
	factor := t.units[i].factor
	if factor == 0 {
		factor = 1
	}
	return known && consecutive(t.values[i]) && math.Abs(dt-factor) > 0.01*factor
}

func isChannelWord(s string) bool {
	p := plain(s)
	for _, prefix := range []string{"ch", "channel", "analog", "math", "volt", "trace", "kanal", "ampl"} {
		if strings.HasPrefix(p, prefix) {
			return true
		}
	}
	return false
}

// consecutive tells sample numbers: whole, one apart.
func consecutive(x []float64) bool {
	for i := range x {
		if x[i] != x[0]+float64(i) || x[i] != math.Trunc(x[i]) {
			return false
		}
	}
	return true
}

// rising tells a column that never falls and is not constant.
func rising(x []float64) bool {
	for i := 1; i < len(x); i++ {
		if !(x[i] >= x[i-1]) {
			return false
		}
	}
	return x[len(x)-1] > x[0]
}

// borrowNames takes names and units of the channels from the header where the columns have none.
func (t *table) borrowNames(roles []role) {
	names := t.header.words("source", "sources", "channel", "channels")
	units := t.header.words("verticalunits", "verticalunit", "vertunits", "yunits", "yunit", "unit", "units")
	k := 0
	for i, r := range roles {
		if r != samples {
			continue
		}
		if (t.names[i] == "" || isPlainWord(t.names[i])) && k < len(names) {
			if _, isNumber := number([]byte(names[k])); !isNumber {
				t.names[i] = names[k]
			}
		}
		if t.units[i].factor == 0 && k < len(units) {
			t.units[i], _ = unitOf(units[k])
		}
		k++
	}
}

// isPlainWord tells names that say what every column holds.
func isPlainWord(s string) bool {
	switch plain(s) {
	case "value", "values", "ampl", "amplitude", "voltage", "volts":
		return true
	}
	return false
}

// channel makes the waveform of column i, timed by column at; -1: by interval only.
func (t *table) channel(i, at int) (Channel, error) {
	c := Channel{Name: t.names[i], Unit: "V"}
	factor := 1.0
	if u := t.units[i]; u.factor > 0 {
		factor = u.factor
		if u.si == "A" {
			c.Unit = "A"
		}
	}
	c.Record.Volts, c.Record.Resolution = t.values[i], t.digit[i]*factor
	for k := range c.Record.Volts {
		c.Record.Volts[k] *= factor
	}
	if err := t.level(i, &c); err != nil {
		return c, err
	}
	return c, t.time(&c, at)
}

// level puts overloads at the end of the range seen, and flags them.
func (t *table) level(i int, c *Channel) error {
	if t.over[i] == 0 {
		return nil
	}
	v := c.Record.Volts
	low, high := math.Inf(1), math.Inf(-1)
	for _, x := range v {
		if !math.IsInf(x, 0) {
			low, high = min(low, x), max(high, x)
		}
	}
	if low > high {
		return &Error{Line: t.first + 1, What: fmt.Sprintf("%s: nothing but overload", t.title(i)), Do: "take a larger range"}
	}
	for k, x := range v {
		v[k] = min(high, max(low, x))
	}
	c.Record.Flags = append(c.Record.Flags, pulse.Flag{Name: pulse.Clipped,
		Words: fmt.Sprintf("%d samples are given as overload; they were taken as the end of the range, between %.4g and %.4g %s; take a larger range", t.over[i], low, high, c.Unit)})
	return nil
}

func (t *table) title(i int) string {
	if t.names[i] != "" {
		return t.names[i]
	}
	return fmt.Sprintf("field %d", t.cols[i]+1)
}
